/**
 * A plain STL reader and writer for the tests, written from the format's public description (Library of Congress, fdd000505) and
 * sharing nothing with the engine: what the product writes is judged by other code than its own.
 */

/** Triangles as a file has them: nine floats each, corner after corner. */
export interface Soup {
	corners: Float32Array;
	/** Solids in order; a binary file has one without a name. */
	solids: { name: string; triangleCount: number }[];
}

const HEADER = 84;
const RECORD = 50;

export function readSoup(bytes: Uint8Array): Soup {
	const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
	const binary = bytes.length >= HEADER && bytes.length === HEADER + RECORD * view.getUint32(80, true);
	return binary ? readBinary(view) : readAscii(new TextDecoder().decode(bytes));
}

function readBinary(view: DataView): Soup {
	const count = view.getUint32(80, true);
	const corners = new Float32Array(9 * count);
	for (let t = 0; t < count; t++) {
		for (let c = 0; c < 9; c++) corners[9 * t + c] = view.getFloat32(HEADER + RECORD * t + 12 + 4 * c, true);
	}
	return { corners, solids: [{ name: '', triangleCount: count }] };
}

function readAscii(text: string): Soup {
	const corners: number[] = [];
	const solids: Soup['solids'] = [];
	for (const line of text.split('\n')) {
		const words = line.trim().split(/\s+/);
		if (words[0] === 'solid') solids.push({ name: line.trim().slice(5).trim(), triangleCount: 0 });
		if (words[0] === 'facet') solids.at(-1)!.triangleCount++;
		if (words[0] === 'vertex') corners.push(Number(words[1]), Number(words[2]), Number(words[3]));
	}
	return { corners: Float32Array.from(corners), solids };
}

export function soupOf(positions: ArrayLike<number>, triangles: ArrayLike<number>, name = ''): Soup {
	const corners = new Float32Array(3 * triangles.length);
	for (let k = 0; k < triangles.length; k++) {
		for (let c = 0; c < 3; c++) corners[3 * k + c] = positions[3 * triangles[k] + c];
	}
	return { corners, solids: [{ name, triangleCount: triangles.length / 3 }] };
}

function normal(corners: Float32Array, t: number): [number, number, number] {
	const [ax, ay, az, bx, by, bz, cx, cy, cz] = corners.subarray(9 * t, 9 * t + 9);
	const n: [number, number, number] = [
		(by - ay) * (cz - az) - (bz - az) * (cy - ay),
		(bz - az) * (cx - ax) - (bx - ax) * (cz - az),
		(bx - ax) * (cy - ay) - (by - ay) * (cx - ax)
	];
	const length = Math.hypot(...n) || 1;
	return [n[0] / length, n[1] / length, n[2] / length];
}

export function writeBinarySoup(soup: Soup, header = 'made for a test'): Uint8Array<ArrayBuffer> {
	const count = soup.corners.length / 9;
	const bytes = new Uint8Array(HEADER + RECORD * count);
	new TextEncoder().encodeInto(header, bytes.subarray(0, 80));
	const view = new DataView(bytes.buffer);
	view.setUint32(80, count, true);
	for (let t = 0; t < count; t++) {
		normal(soup.corners, t).forEach((value, c) => view.setFloat32(HEADER + RECORD * t + 4 * c, value, true));
		for (let c = 0; c < 9; c++) view.setFloat32(HEADER + RECORD * t + 12 + 4 * c, soup.corners[9 * t + c], true);
	}
	return bytes;
}

export function writeAsciiSoup(soup: Soup): string {
	const lines: string[] = [];
	let t = 0;
	for (const { name, triangleCount } of soup.solids) {
		lines.push(`solid ${name}`);
		for (const end = t + triangleCount; t < end; t++) {
			lines.push(`facet normal ${normal(soup.corners, t).join(' ')}`, ' outer loop');
			for (let c = 0; c < 3; c++)
				lines.push(`  vertex ${[...soup.corners.subarray(9 * t + 3 * c, 9 * t + 3 * c + 3)].join(' ')}`);
			lines.push(' endloop', 'endfacet');
		}
		lines.push(`endsolid ${name}`);
	}
	return lines.join('\n') + '\n';
}

/** Enclosed volume by the divergence theorem, in the cube of the file's unit; about the first corner, against cancellation. */
export function soupVolume({ corners }: Soup): number {
	const [ox, oy, oz] = corners;
	let sum = 0;
	for (let at = 0; at < corners.length; at += 9) {
		const [ax, ay, az, bx, by, bz, cx, cy, cz] = corners.subarray(at, at + 9);
		const [px, py, pz, qx, qy, qz, rx, ry, rz] = [
			ax - ox,
			ay - oy,
			az - oz,
			bx - ox,
			by - oy,
			bz - oz,
			cx - ox,
			cy - oy,
			cz - oz
		];
		sum += px * (qy * rz - qz * ry) + py * (qz * rx - qx * rz) + pz * (qx * ry - qy * rx);
	}
	return sum / 6;
}

export function soupArea({ corners }: Soup): number {
	let sum = 0;
	for (let at = 0; at < corners.length; at += 9) {
		const [ax, ay, az, bx, by, bz, cx, cy, cz] = corners.subarray(at, at + 9);
		sum += Math.hypot(
			(by - ay) * (cz - az) - (bz - az) * (cy - ay),
			(bz - az) * (cx - ax) - (bx - ax) * (cz - az),
			(bx - ax) * (cy - ay) - (by - ay) * (cx - ax)
		);
	}
	return sum / 2;
}

/** Vertices by equal coordinates, in the order in which they first appear, and the triangles that name them. */
export function weldSoup({ corners }: Soup): { positions: Float32Array; triangles: Uint32Array } {
	const numbers = new Map<string, number>();
	const positions: number[] = [];
	const triangles = new Uint32Array(corners.length / 3);
	for (let k = 0; k < triangles.length; k++) {
		const at = [...corners.subarray(3 * k, 3 * k + 3)].map((value) => value + 0);
		const place = at.join();
		let number = numbers.get(place);
		if (number === undefined) {
			number = positions.length / 3;
			numbers.set(place, number);
			positions.push(...at);
		}
		triangles[k] = number;
	}
	return { positions: Float32Array.from(positions), triangles };
}
