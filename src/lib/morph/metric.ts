/** Coefficients of products of two Bernstein polynomials (or their slopes) of degree n in those of degree 2n. */
export interface ProductTables {
	count: number;
	/** Polynomials of the doubled degree: 2n + 1. */
	functions: number;
	/** B_i B_j, B'_i B_j, B_i B'_j, B'_i B'_j: count x count x functions each. */
	values: Float64Array;
	slopeValue: Float64Array;
	valueSlope: Float64Array;
	slopes: Float64Array;
}

function binomials(n: number): Float64Array {
	const row = new Float64Array(n + 1);
	row[0] = 1;
	for (let i = 1; i <= n; i++) row[i] = (row[i - 1] * (n - i + 1)) / i;
	return row;
}

/** Raises coefficients of degree m to m + 1 (Farin, Curves and Surfaces for CAGD, 6.1). */
export function elevate(coefficients: Float64Array): Float64Array {
	const m = coefficients.length - 1;
	const out = new Float64Array(m + 2);
	for (let i = 0; i <= m + 1; i++) {
		if (i > 0) out[i] += (i / (m + 1)) * coefficients[i - 1];
		if (i <= m) out[i] += (1 - i / (m + 1)) * coefficients[i];
	}
	return out;
}

/**
 * Products of Bernstein polynomials are Bernstein polynomials of the summed degree; slopes have one degree less, so
 * their products are elevated to 2n and need no moments of their own. `scale` turns slopes in t into slopes in metres.
 */
export function productTables(degree: number, scale: number): ProductTables {
	const n = degree;
	const count = n + 1;
	const functions = 2 * n + 1;
	const full = binomials(n);
	const low = binomials(n - 1);
	const tables: ProductTables = {
		count,
		functions,
		values: new Float64Array(count * count * functions),
		slopeValue: new Float64Array(count * count * functions),
		valueSlope: new Float64Array(count * count * functions),
		slopes: new Float64Array(count * count * functions)
	};
	const of2n = binomials(2 * n);
	const of2n1 = binomials(2 * n - 1);
	const of2n2 = binomials(2 * n - 2);
	/** The slope of B_i as signed polynomials of degree n - 1. */
	const slope = (i: number) => {
		const parts: [number, number][] = [];
		if (i > 0) parts.push([i - 1, n * scale]);
		if (i < n) parts.push([i, -n * scale]);
		return parts;
	};
	for (let i = 0; i < count; i++) {
		for (let j = 0; j < count; j++) {
			const at = (i * count + j) * functions;
			const mirrored = (j * count + i) * functions;
			tables.values[at + i + j] = (full[i] * full[j]) / of2n[i + j];
			const once = new Float64Array(2 * n);
			for (const [p, f] of slope(i)) once[p + j] += (f * low[p] * full[j]) / of2n1[p + j];
			const raised = elevate(once);
			tables.slopeValue.set(raised, at);
			tables.valueSlope.set(raised, mirrored);
			const twice = new Float64Array(2 * n - 1);
			for (const [p, f] of slope(i)) {
				for (const [q, g] of slope(j)) twice[p + q] += (f * g * low[p] * low[q]) / of2n2[p + q];
			}
			tables.slopes.set(elevate(elevate(twice)), at);
		}
	}
	return tables;
}

/** Names the six entries of a symmetric 3 x 3 matrix as they are stored. */
export const UU = 0;
export const VV = 1;
export const WW = 2;
export const UV = 3;
export const UW = 4;
export const VW = 5;

/**
 * The metric M + r^2 K on the free control points from moments.
 *
 * M_ab = sum over v of m_v B_a B_b, K_ab = sum over v of m_v grad B_a . (I - n n') grad B_b: the tangential Dirichlet
 * energy lumped at the vertices. Only moments of m (I - n n') are needed: its trace is 2 m.
 *
 * @param moments of m (I - n n') in box axes: 2 groups (UU VV WW, UV UW VW) x functions_u x functions_v x functions_w x 3
 * @param tables product tables by axis, slopes per metre
 * @param smoothing r in metres
 * @param freeIndex row of each control point in the result, -1 for held ones
 * @param free number of rows
 * @returns free x free, symmetric
 */
export function metricFromMoments(
	moments: Float64Array,
	tables: [ProductTables, ProductTables, ProductTables],
	smoothing: number,
	freeIndex: Int32Array,
	free: number
): Float64Array {
	const [tu, tv, tw] = tables;
	const fu = tu.functions;
	const fv = tv.functions;
	const fw = tw.functions;
	const volume = fu * fv * fw;
	const r2 = smoothing * smoothing;
	const set = (k: number) => {
		const from = 3 * volume * Math.floor(k / 3) + (k % 3);
		return Float64Array.from({ length: volume }, (_, i) => moments[from + 3 * i]);
	};
	const [suu, svv, sww, suv, suw, svw] = [UU, VV, WW, UV, UW, VW].map(set);
	const mass = new Float64Array(volume);
	for (let i = 0; i < volume; i++) mass[i] = (suu[i] + svv[i] + sww[i]) / 2;
	const out = new Float64Array(free * free);
	const plane = fu * fv;
	// Contracted over w; the letters say which axes carry a slope on the left and right factor.
	const alongW = Array.from({ length: 9 }, () => new Float64Array(plane));
	const [m00, uu00, vv00, uv00, ww11, uw01, uw10, vw01, vw10] = alongW;
	const x00 = new Float64Array(fu);
	const x11 = new Float64Array(fu);
	const x10 = new Float64Array(fu);
	const x01 = new Float64Array(fu);

	const contract = (
		source: Float64Array,
		table: Float64Array,
		at: number,
		from: number,
		to: number,
		target: Float64Array
	) => {
		for (let pq = 0; pq < plane; pq++) {
			let sum = 0;
			const base = pq * fw;
			for (let r = from; r <= to; r++) sum += table[at + r] * source[base + r];
			target[pq] = sum;
		}
	};

	for (let k = 0; k < tw.count; k++) {
		for (let l = 0; l < tw.count; l++) {
			const at = (k * tw.count + l) * fw;
			const r0 = k + l;
			const r1 = Math.max(0, r0 - 1);
			const r2low = Math.max(0, r0 - 2);
			const r1high = Math.min(fw - 1, r0 + 1);
			const r2high = Math.min(fw - 1, r0 + 2);
			contract(mass, tw.values, at, r0, r0, m00);
			if (r2 > 0) {
				contract(suu, tw.values, at, r0, r0, uu00);
				contract(svv, tw.values, at, r0, r0, vv00);
				contract(suv, tw.values, at, r0, r0, uv00);
				contract(sww, tw.slopes, at, r2low, r2high, ww11);
				contract(suw, tw.valueSlope, at, r1, r1high, uw01);
				contract(suw, tw.slopeValue, at, r1, r1high, uw10);
				contract(svw, tw.valueSlope, at, r1, r1high, vw01);
				contract(svw, tw.slopeValue, at, r1, r1high, vw10);
			}
			for (let i = 0; i < tv.count; i++) {
				for (let j = 0; j < tv.count; j++) {
					const row = (i * tv.count + j) * fv;
					const q0 = i + j;
					const q2low = Math.max(0, q0 - 2);
					const q2high = Math.min(fv - 1, q0 + 2);
					for (let p = 0; p < fu; p++) {
						const base = p * fv;
						const c00 = tv.values[row + q0];
						let a00 = c00 * m00[base + q0];
						if (r2 > 0) {
							a00 += r2 * c00 * ww11[base + q0];
							let a10 = c00 * uw01[base + q0];
							let a01 = c00 * uw10[base + q0];
							let energy = 0;
							for (let q = q2low; q <= q2high; q++) {
								const s10 = tv.slopeValue[row + q];
								const s01 = tv.valueSlope[row + q];
								energy += tv.slopes[row + q] * vv00[base + q] + s10 * vw01[base + q] + s01 * vw10[base + q];
								a10 += s01 * uv00[base + q];
								a01 += s10 * uv00[base + q];
							}
							a00 += r2 * energy;
							x11[p] = r2 * c00 * uu00[base + q0];
							x10[p] = r2 * a10;
							x01[p] = r2 * a01;
						}
						x00[p] = a00;
					}
					for (let a = 0; a < tu.count; a++) {
						const left = freeIndex[(a * tv.count + i) * tw.count + k];
						if (left < 0) continue;
						for (let b = 0; b < tu.count; b++) {
							const right = freeIndex[(b * tv.count + j) * tw.count + l];
							if (right < 0 || right > left) continue;
							const line = (a * tu.count + b) * fu;
							const p0 = a + b;
							let sum = tu.values[line + p0] * x00[p0];
							if (r2 > 0) {
								const high = Math.min(fu - 1, p0 + 2);
								for (let p = Math.max(0, p0 - 2); p <= high; p++) {
									sum +=
										tu.slopes[line + p] * x11[p] + tu.slopeValue[line + p] * x10[p] + tu.valueSlope[line + p] * x01[p];
								}
							}
							out[left * free + right] = sum;
						}
					}
				}
			}
		}
	}
	for (let a = 0; a < free; a++) for (let b = 0; b < a; b++) out[b * free + a] = out[a * free + b];
	return out;
}
