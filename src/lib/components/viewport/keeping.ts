import {
	BoxGeometry,
	BufferAttribute,
	BufferGeometry,
	DoubleSide,
	EdgesGeometry,
	Group,
	LineBasicMaterial,
	LineSegments,
	Mesh,
	MeshBasicMaterial,
	PlaneGeometry,
	Quaternion,
	Vector3
} from 'three';
import type { Plane } from '$lib/api/schemas/common';
import type { KeepOut } from '$lib/api/schemas/drawn';
import type { KeepOutMesh } from '$lib/state/bench-keeping.svelte';
import type { DisplayMesh, Vec3 } from '$lib/workers/display-protocol';
import type { Palette } from './palette';

export interface KeepingDrawing {
	keepOuts: { keepOut: KeepOut; mesh: KeepOutMesh | null; selected: boolean; used: boolean }[];
	symmetry: Plane | null;
	/** Triangles that a move leaves alone, uint32 ids. */
	locked: Uint32Array;
	/** By vertex, how much of a move is taken away there: 1 on locked triangles, falling to 0 over the blend distance. */
	spared: Float32Array | null;
}

const ALPHA = { fill: 0.1, chosen: 0.2, line: 0.55, unused: 0.25 };

/** Keep-outs, the symmetry plane and locked triangles, translucent over the surface. */
export class Keeping {
	readonly group = new Group();

	draw({ keepOuts, symmetry, locked, spared }: KeepingDrawing, surface: DisplayMesh | null, palette: Palette) {
		this.clear();
		if (!surface) return;
		const { min, max } = surface.bounds;
		const size = Math.hypot(max[0] - min[0], max[1] - min[1], max[2] - min[2]);
		const middle = min.map((x, k) => (x + max[k]) / 2) as Vec3;
		for (const { keepOut, mesh, selected, used } of keepOuts) {
			const body = bodyOf(keepOut, mesh, middle, size);
			if (!body) continue;
			const weight = used ? 1 : ALPHA.unused;
			this.#add(body, palette, (selected ? ALPHA.chosen : ALPHA.fill) * weight, ALPHA.line * weight);
		}
		if (symmetry) {
			const sheet = sheetAt(symmetry.point, symmetry.normal, middle, 0.66 * size);
			this.#add({ ...sheet, lines: true }, palette, 0, 0.35);
		}
		if (locked.length > 0) this.group.add(lockedMesh(locked, surface, palette));
		if (spared && spared.length === surface.positions.length / 3) this.group.add(sparedMesh(spared, surface, palette));
	}

	#add({ geometry, at, turned, lines }: Body, palette: Palette, fill: number, line: number) {
		if (fill > 0) {
			const material = new MeshBasicMaterial({
				color: palette.ink,
				transparent: true,
				opacity: fill,
				side: DoubleSide,
				depthWrite: false
			});
			const mesh = new Mesh(geometry, material);
			mesh.position.copy(at);
			mesh.quaternion.copy(turned);
			mesh.renderOrder = 2;
			this.group.add(mesh);
		}
		if (!lines) return;
		const edges = new LineSegments(
			new EdgesGeometry(geometry),
			new LineBasicMaterial({ color: palette.ink, transparent: true, opacity: line })
		);
		edges.position.copy(at);
		edges.quaternion.copy(turned);
		this.group.add(edges);
	}

	clear() {
		for (const child of [...this.group.children] as (Mesh | LineSegments)[]) {
			this.group.remove(child);
			child.geometry.dispose();
			(child.material as MeshBasicMaterial).dispose();
		}
	}
}

const OVERLAY = { locked: 0.2, spared: 0.4 };

/** Triangles darkened where they lie; the surface's own arrays are borrowed. */
export function lockedMesh(locked: Uint32Array, surface: DisplayMesh, palette: Palette): Mesh {
	const index = new Uint32Array(3 * locked.length);
	locked.forEach((t, i) => index.set(surface.triangles.subarray(3 * t, 3 * t + 3), 3 * i));
	return overlay(index, surface, palette, OVERLAY.locked, null);
}

/** The soft edge of the locks: as dark at a vertex as the move is taken away there. */
function sparedMesh(spared: Float32Array, surface: DisplayMesh, palette: Palette): Mesh {
	const index: number[] = [];
	const { triangles } = surface;
	for (let e = 0; e < triangles.length; e += 3) {
		const [a, b, c] = [triangles[e], triangles[e + 1], triangles[e + 2]];
		if (spared[a] > 0 || spared[b] > 0 || spared[c] > 0) index.push(a, b, c);
	}
	return overlay(Uint32Array.from(index), surface, palette, OVERLAY.spared, spared);
}

function overlay(
	index: Uint32Array,
	surface: DisplayMesh,
	palette: Palette,
	opacity: number,
	alpha: Float32Array | null
): Mesh {
	const geometry = new BufferGeometry();
	geometry.setAttribute('position', new BufferAttribute(surface.positions, 3));
	geometry.setIndex(new BufferAttribute(index, 1));
	const material = new MeshBasicMaterial({
		color: palette.ink,
		transparent: true,
		opacity,
		side: DoubleSide,
		depthWrite: false
	});
	if (alpha) {
		const colours = new Float32Array(4 * alpha.length).fill(1);
		alpha.forEach((a, v) => (colours[4 * v + 3] = a));
		geometry.setAttribute('color', new BufferAttribute(colours, 4));
		material.vertexColors = true;
	}
	const mesh = new Mesh(geometry, material);
	mesh.frustumCulled = false;
	mesh.renderOrder = 1;
	return mesh;
}

interface Body {
	geometry: BufferGeometry;
	at: Vector3;
	turned: Quaternion;
	lines: boolean;
}

function sheetAt(point: readonly number[], normal: readonly number[], middle: Vec3, size: number): Body {
	const n = new Vector3(...(normal as Vec3));
	const away = new Vector3(...middle).sub(new Vector3(...(point as Vec3))).dot(n);
	return {
		geometry: new PlaneGeometry(size, size),
		at: new Vector3(...middle).addScaledVector(n, -away),
		turned: new Quaternion().setFromUnitVectors(new Vector3(0, 0, 1), n),
		lines: true
	};
}

function bodyOf({ geometry }: KeepOut, mesh: KeepOutMesh | null, middle: Vec3, size: number): Body | null {
	if (geometry.kind === 'halfSpace') return sheetAt(geometry.point, geometry.normal, middle, 0.75 * size);
	if (geometry.kind === 'box') {
		const [x, y, z] = geometry.halfSize;
		return {
			geometry: new BoxGeometry(2 * x, 2 * y, 2 * z),
			at: new Vector3(...geometry.centre),
			turned: new Quaternion(...geometry.rotation),
			lines: true
		};
	}
	if (!mesh) return null;
	const body = new BufferGeometry();
	body.setAttribute('position', new BufferAttribute(mesh.positions, 3));
	body.setIndex(new BufferAttribute(mesh.triangles, 1));
	return { geometry: body, at: new Vector3(), turned: new Quaternion(), lines: mesh.triangles.length < 60_000 };
}
