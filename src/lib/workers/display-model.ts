/**
 * The display worker's work: it keeps the surface that the page shows and answers its questions about it. No messages here,
 * so that tests call it directly; `display.worker.ts` is the shell around it.
 */
import { BufferAttribute, BufferGeometry, DoubleSide, Ray, Vector3 } from 'three';
import { MeshBVH } from 'three-mesh-bvh';
import { embed, latticeMotion, lockWeights, toMetres, type DesignBox, type LatticeMotion } from '$lib/morph';
import { along, averaged, boundsOf, histogramOf, product, scaled, spreadOf, vertexNormals } from './display-kernels';
import { SurfaceReach } from './paint-kernels';
import type {
	DisplayCall,
	DisplayField,
	DisplayInput,
	DisplayMesh,
	DisplayMove,
	DisplayOutput,
	FieldName,
	Pick,
	Reach,
	Share,
	Vec3,
	VertexField
} from './display-protocol';

const MM_PER_M = 1000;
const KEPT_MOTIONS = 16;
/** Of averaging over neighbours, before a map's contour lines are drawn: about three edges wide. */
const LEVEL_PASSES = 16;

interface Loaded {
	/** N x 3, metres; float64 for the engine, float32 for the picture. */
	exact: Float64Array;
	positions: Float32Array;
	normals: Float32Array;
	triangles: Uint32Array;
	/** N, m^2: a third of the triangles at each vertex. */
	areas: Float32Array;
	area: number;
}

interface Moved {
	/** Vertices in any box, ascending, and their displacements (n x 3, metres). */
	vertices: Uint32Array;
	displacement: Float64Array;
	/** N x 3, metres, as drawn: exaggerated. */
	positions: Float32Array;
}

export class DisplayModel {
	#loaded: Loaded | null = null;
	#moved: Moved | null = null;
	#fields = new Map<FieldName, Float32Array>();
	#motions = new Map<string, LatticeMotion>();
	#trees: { rest: MeshBVH | null; moved: MeshBVH | null } = { rest: null, moved: null };
	#reach: SurfaceReach | null = null;

	readonly calls: { [K in DisplayCall]: (input: DisplayInput<K>) => DisplayOutput<K> } = {
		load: ({ positions, triangles, metresPerUnit }) => this.#load(positions, triangles, metresPerUnit),
		map: ({ values, scale }) => this.#map(new Float32Array(values), scale),
		difference: ({ positions, metresPerUnit }) => {
			const { positions: here, normals } = this.#surface;
			const there = scaled(this.#sized(new Float32Array(positions), here.length), metresPerUnit);
			return this.#keep('distance', along(normals, there, here, MM_PER_M));
		},
		move: ({ boxes, lattices, field, exaggeration }) => this.#move(boxes, lattices, field ?? null, exaggeration),
		exaggerate: ({ exaggeration }) => this.#draw(exaggeration),
		gain: () => this.#gain(),
		histogram: ({ field, extent, bins }) => {
			const values = this.#fields.get(field);
			return values ? histogramOf(values, this.#surface.areas, extent, bins) : new Float32Array(bins);
		},
		share: ({ box, field }) => this.#share(box, field),
		pick: ({ origin, direction, on, fields }) => this.#pick(origin, direction, on, fields),
		reach: (input) => this.#paint(input),
		spared: ({ locks }) => {
			const { exact, triangles } = this.#surface;
			return Float32Array.from(lockWeights(exact, triangles, locks), (weight) => 1 - weight);
		}
	};

	get #surface(): Loaded {
		if (!this.#loaded) throw new Error('No surface has been loaded.');
		return this.#loaded;
	}

	#load(positionBytes: ArrayBuffer, triangleBytes: ArrayBuffer, metresPerUnit: number): DisplayMesh {
		const file = new Float32Array(positionBytes);
		const triangles = new Uint32Array(triangleBytes);
		const last = file.length / 3 - 1;
		for (const v of triangles) {
			if (v > last) throw new Error(`The triangles name vertex ${v}; the shape has ${last + 1} vertices.`);
		}
		const exact = toMetres(file, metresPerUnit);
		const positions = Float32Array.from(exact);
		const areas = new Float32Array(file.length / 3);
		const normals = vertexNormals(positions, triangles, areas);
		const area = areas.reduce((sum, a) => sum + a, 0);
		this.#loaded = { exact, positions, normals, triangles, areas, area };
		this.#moved = null;
		this.#fields.clear();
		this.#motions.clear();
		this.#trees = { rest: null, moved: null };
		this.#reach = null;
		return {
			positions: positions.slice(),
			normals: normals.slice(),
			triangles: triangles.slice(),
			bounds: boundsOf(positions),
			area
		};
	}

	#map(values: Float32Array, scale: number): DisplayField {
		this.#sized(values, this.#surface.areas.length);
		const shown = scaled(values, scale);
		this.#fields.delete('gain');
		return { ...this.#keep('map', shown), levels: averaged(shown, this.#surface.triangles, LEVEL_PASSES) };
	}

	#gain(): DisplayField {
		const map = this.#fields.get('map');
		const move = this.#fields.get('move');
		if (!map || !move) throw new Error('Gain density needs a map and a previewed move.');
		const values = product(map, move);
		const levels = averaged(values, this.#surface.triangles, LEVEL_PASSES);
		return { ...this.#keep('gain', values), levels };
	}

	/** Keeps a field for later questions and hands out a copy with its spread. */
	#keep(name: FieldName, values: Float32Array): DisplayField {
		this.#fields.set(name, values);
		const copy = values.slice();
		return { values: copy, levels: copy, spread: spreadOf(values, this.#surface.areas) };
	}

	#sized(values: Float32Array, length: number): Float32Array {
		if (values.length !== length) {
			throw new Error(`Expected ${length} numbers for this surface, got ${values.length}.`);
		}
		return values;
	}

	#motion(box: DesignBox): LatticeMotion {
		const { centre, halfSize, rotation, lattice, basis, degree } = box;
		const key = JSON.stringify([centre, halfSize, rotation, lattice, basis, degree]);
		let motion = this.#motions.get(key);
		if (!motion) {
			motion = latticeMotion(this.#surface.exact, box);
			// Each edit of a box leaves one behind: the last few are enough.
			if (this.#motions.size >= KEPT_MOTIONS) this.#motions.clear();
			this.#motions.set(key, motion);
		}
		return motion;
	}

	#move(boxes: DesignBox[], lattices: Float64Array[], field: VertexField | null, exaggeration: number): DisplayMove {
		const { positions, normals, areas } = this.#surface;
		const shift = new Float64Array(positions.length);
		const touched = new Uint8Array(areas.length);
		const add = (inside: Uint32Array, displacement: ArrayLike<number>) =>
			inside.forEach((v, i) => {
				touched[v] = 1;
				for (let k = 0; k < 3; k++) shift[3 * v + k] += displacement[3 * i + k];
			});
		if (field) add(field.vertices, field.displacement);
		else {
			boxes.forEach((box, b) => {
				const motion = this.#motion(box);
				add(motion.inside, motion.displace(lattices[b]));
			});
		}
		const vertices = new Uint32Array(touched.reduce((sum, t) => sum + t, 0));
		for (let v = 0, at = 0; v < touched.length; v++) if (touched[v]) vertices[at++] = v;
		const displacement = new Float64Array(3 * vertices.length);
		const values = new Float32Array(areas.length);
		vertices.forEach((v, i) => {
			const at = 3 * v;
			displacement.set(shift.subarray(at, at + 3), 3 * i);
			values[v] =
				MM_PER_M * (shift[at] * normals[at] + shift[at + 1] * normals[at + 1] + shift[at + 2] * normals[at + 2]);
		});
		this.#fields.set('move', values);
		this.#fields.delete('gain');
		this.#moved = { vertices, displacement, positions };
		return this.#draw(exaggeration);
	}

	#draw(exaggeration: number): DisplayMove {
		const { exact, triangles, positions: rest } = this.#surface;
		const moved = this.#moved;
		const values = this.#fields.get('move');
		if (!moved || !values) throw new Error('No move has been previewed.');
		const positions = rest.slice();
		moved.vertices.forEach((v, i) => {
			for (let k = 0; k < 3; k++) {
				positions[3 * v + k] = exact[3 * v + k] + exaggeration * moved.displacement[3 * i + k];
			}
		});
		moved.positions = positions;
		this.#trees.moved = null;
		return {
			positions: positions.slice(),
			normals: vertexNormals(positions, triangles),
			field: this.#keep('move', values)
		};
	}

	#share(box: DesignBox, field: FieldName | null): Share {
		const { areas, area } = this.#surface;
		const { inside } = embed(this.#surface.exact, box);
		const values = field ? this.#fields.get(field) : undefined;
		let within = 0;
		let part = 0;
		for (const v of inside) {
			within += areas[v];
			if (values) part += Math.abs(values[v]) * areas[v];
		}
		let whole = 0;
		values?.forEach((x, v) => (whole += Math.abs(x) * areas[v]));
		return { area: within / area, vertices: inside.length, ofField: whole > 0 ? part / whole : null };
	}

	#hit(origin: Vec3, direction: Vec3, on: 'rest' | 'moved') {
		const { triangles, positions: rest } = this.#surface;
		const which = on === 'moved' && this.#moved ? 'moved' : 'rest';
		const positions = which === 'moved' && this.#moved ? this.#moved.positions : rest;
		const tree = (this.#trees[which] ??= buildTree(positions, triangles));
		const hit = tree.raycastFirst(new Ray(new Vector3(...origin), new Vector3(...direction)), DoubleSide);
		if (!hit || hit.faceIndex == null || !hit.face) return null;
		const triangle = hit.faceIndex;
		const corners = [0, 1, 2].map((k) => triangles[3 * triangle + k]);
		const share = barycentric(
			hit.point,
			corners.map((v) => new Vector3().fromArray(positions, 3 * v))
		);
		return { point: hit.point, normal: hit.face.normal, triangle, corners, share };
	}

	#pick(origin: Vec3, direction: Vec3, on: 'rest' | 'moved', fields: FieldName[]): Pick | null {
		const hit = this.#hit(origin, direction, on);
		if (!hit) return null;
		const { point, normal, triangle, corners, share } = hit;
		return {
			point: [point.x, point.y, point.z],
			normal: [normal.x, normal.y, normal.z],
			triangle,
			values: fields.map((name) => {
				const values = this.#fields.get(name);
				return values ? share.reduce((sum, w, k) => sum + w * values[corners[k]], 0) : null;
			})
		};
	}

	#paint(input: Reach): Uint32Array {
		const { exact, triangles } = this.#surface;
		const reach = (this.#reach ??= new SurfaceReach(exact, triangles));
		if (input.kind === 'box') return reach.inBox(input.box);
		const reached = new Set<number>();
		for (const { origin, direction } of input.sights) {
			const hit = this.#hit(origin, direction, input.on);
			if (!hit || (input.kind === 'fill' && reached.has(hit.triangle))) continue;
			// A moved surface is painted where its triangles lie at rest.
			const rest = [0, 1, 2].map((k) => hit.share.reduce((sum, w, i) => sum + w * exact[3 * hit.corners[i] + k], 0));
			const found =
				input.kind === 'brush'
					? reach.brush(hit.triangle, rest as Vec3, input.radius)
					: reach.fill(hit.triangle, input.angle);
			for (const t of found) reached.add(t);
		}
		return Uint32Array.from(reached).sort();
	}
}

function buildTree(positions: Float32Array, triangles: Uint32Array): MeshBVH {
	const geometry = new BufferGeometry();
	geometry.setAttribute('position', new BufferAttribute(positions, 3));
	geometry.setIndex(new BufferAttribute(triangles, 1));
	// Indirect: the triangles keep their order, which the page and the file know them by.
	return new MeshBVH(geometry, { indirect: true });
}

/** Shares of the triangle's corners in a point of it. */
function barycentric(p: Vector3, [a, b, c]: Vector3[]): [number, number, number] {
	const n = new Vector3().crossVectors(b.clone().sub(a), c.clone().sub(a));
	const area = n.lengthSq();
	if (area === 0) return [1, 0, 0];
	const part = (q: Vector3, r: Vector3) => n.dot(new Vector3().crossVectors(r.clone().sub(q), p.clone().sub(q))) / area;
	return [part(b, c), part(c, a), part(a, b)];
}
