/** Surfaces for the tests, made with plain code. */
import { weldSoup, type Soup } from './stl';

export interface TestMesh {
	/** N x 3. */
	positions: Float64Array;
	/** F x 3, counter-clockwise from outside. */
	triangles: Uint32Array;
}

const T = (1 + Math.sqrt(5)) / 2;
// The icosahedron's corners and faces in the order of the yardstick that the reference figures come from.
const CORNERS = [
	[-1, T, 0],
	[1, T, 0],
	[-1, -T, 0],
	[1, -T, 0],
	[0, -1, T],
	[0, 1, T],
	[0, -1, -T],
	[0, 1, -T],
	[T, 0, -1],
	[T, 0, 1],
	[-T, 0, -1],
	[-T, 0, 1]
];
const FACES = [
	[0, 11, 5],
	[0, 5, 1],
	[0, 1, 7],
	[0, 7, 10],
	[0, 10, 11],
	[1, 5, 9],
	[5, 11, 4],
	[11, 10, 2],
	[10, 7, 6],
	[7, 1, 8],
	[3, 9, 4],
	[3, 4, 2],
	[3, 2, 6],
	[3, 6, 8],
	[3, 8, 9],
	[4, 9, 5],
	[2, 4, 11],
	[6, 2, 10],
	[8, 6, 7],
	[9, 8, 1]
];

/** The unit sphere as a subdivided icosahedron (20 x 4^level triangles), scaled to semi-axes. */
export function ellipsoid(level: number, semiAxes: readonly [number, number, number]): TestMesh {
	const positions = CORNERS.map((corner) => unit(corner));
	let faces = FACES;
	for (let n = 0; n < level; n++) {
		const middles = new Map<number, number>();
		const middle = (a: number, b: number) => {
			const key = Math.min(a, b) * 1e7 + Math.max(a, b);
			let number = middles.get(key);
			if (number === undefined) {
				number = positions.length;
				middles.set(key, number);
				positions.push(unit([0, 1, 2].map((c) => positions[a][c] + positions[b][c])));
			}
			return number;
		};
		faces = faces.flatMap(([i, j, k]) => {
			const [a, b, c] = [middle(i, j), middle(j, k), middle(k, i)];
			return [
				[i, a, c],
				[j, b, a],
				[k, c, b],
				[a, b, c]
			];
		});
	}
	return {
		positions: Float64Array.from(positions.flatMap((p) => p.map((value, c) => value * semiAxes[c]))),
		triangles: Uint32Array.from(faces.flat())
	};
}

function unit(v: number[]): number[] {
	const length = Math.hypot(...v);
	return v.map((value) => value / length);
}

/** The same triangles ordered along x, so that vertices that are near in space are near in number. */
export function sortedAlongX({ positions, triangles }: TestMesh): TestMesh {
	const middle = (t: number) =>
		positions[3 * triangles[3 * t]] + positions[3 * triangles[3 * t + 1]] + positions[3 * triangles[3 * t + 2]];
	const order = Array.from({ length: triangles.length / 3 }, (_, t) => t).sort((a, b) => middle(a) - middle(b));
	return { positions, triangles: Uint32Array.from(order.flatMap((t) => [...triangles.subarray(3 * t, 3 * t + 3)])) };
}

/**
 * Sensitivity by vertex turned into dJ = sum of s_v m_v n_v . dx_v, with m_v a third of the area around the vertex and n_v the
 * area-weighted unit normal: DESIGN's definition, computed here from the two files alone.
 * @param metresPerUnit of both soups' coordinates
 * @param value density at a parent vertex, in objective per metre per square metre, of its coordinates in the file's unit
 */
export function predictedChange(
	parent: Soup,
	child: Soup,
	metresPerUnit: number,
	value: (x: number, y: number, z: number) => number
): number {
	const { positions, triangles } = weldSoup(parent);
	const count = positions.length / 3;
	const mass = new Float64Array(count);
	const normals = new Float64Array(3 * count);
	const moved = new Float64Array(3 * count);
	for (let t = 0; t < triangles.length; t += 3) {
		const [a, b, c] = [...triangles.subarray(t, t + 3)].map((v) =>
			[...positions.subarray(3 * v, 3 * v + 3)].map((x) => x * metresPerUnit)
		);
		const n = [0, 1, 2].map((k) => {
			const [i, j] = [(k + 1) % 3, (k + 2) % 3];
			return (b[i] - a[i]) * (c[j] - a[j]) - (b[j] - a[j]) * (c[i] - a[i]);
		});
		const area = Math.hypot(...n) / 2;
		for (let corner = 0; corner < 3; corner++) {
			const v = triangles[t + corner];
			mass[v] += area / 3;
			for (let k = 0; k < 3; k++) {
				normals[3 * v + k] += n[k];
				const at = 3 * (t + corner) + k;
				moved[3 * v + k] = (child.corners[at] - parent.corners[at]) * metresPerUnit;
			}
		}
	}
	let sum = 0;
	for (let v = 0; v < count; v++) {
		const n = normals.subarray(3 * v, 3 * v + 3);
		const along = (n[0] * moved[3 * v] + n[1] * moved[3 * v + 1] + n[2] * moved[3 * v + 2]) / (Math.hypot(...n) || 1);
		sum += value(positions[3 * v], positions[3 * v + 1], positions[3 * v + 2]) * mass[v] * along;
	}
	return sum;
}

/** A map as a CSV file: one row for each vertex of the soup. */
export function csvOf(soup: Soup, value: (x: number, y: number, z: number) => number): string {
	const { positions } = weldSoup(soup);
	const rows = ['x,y,z,sensitivity'];
	for (let v = 0; v < positions.length; v += 3) {
		const [x, y, z] = positions.subarray(v, v + 3);
		rows.push(`${x},${y},${z},${value(x, y, z)}`);
	}
	return rows.join('\n') + '\n';
}
