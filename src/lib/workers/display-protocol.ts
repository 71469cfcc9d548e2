/**
 * What the Bench's page and its display worker say to each other. Lengths are metres, positions float32 (they are drawn, not
 * computed with); displacements and differences that are shown as values are millimetres. Every array that crosses is
 * transferred: its sender must not use it again.
 */
import type { DesignBox } from '$lib/morph';

export type Vec3 = [number, number, number];

/** A surface ready to be drawn. */
export interface DisplayMesh {
	/** N x 3, metres. */
	positions: Float32Array;
	/** N x 3, unit, weighted by area. */
	normals: Float32Array;
	/** F x 3. */
	triangles: Uint32Array;
	bounds: { min: Vec3; max: Vec3 };
	/** m^2 */
	area: number;
}

/** How the values of a field are spread over the surface. Weighted by area, so that the mesh's density does not count. */
export interface FieldSpread {
	min: number;
	max: number;
	/** |value| below which 98 % of the area lies; 0 when the field is 0 everywhere. */
	robust: number;
}

/** One value at each vertex. */
export interface DisplayField {
	values: Float32Array;
	/** What contour lines follow: a map averaged over its neighbours, since its noise would draw lines of its own; else the values. */
	levels: Float32Array;
	spread: FieldSpread;
}

/** The surface as a previewed move leaves it. */
export interface DisplayMove {
	/** N x 3, metres: rest + exaggeration x displacement. */
	positions: Float32Array;
	normals: Float32Array;
	/** Displacement along the rest surface's normal, mm; not exaggerated. */
	field: DisplayField;
}

export interface Share {
	/** Share (0..1) of the surface's area whose vertices lie in the box. */
	area: number;
	vertices: number;
	/** The field's sum over the area inside divided by its sum of |value| over all: null without a field. */
	ofField: number | null;
}

export interface Pick {
	/** On the surface as it is drawn, metres. */
	point: Vec3;
	/** Of the triangle, unit, outward. */
	normal: Vec3;
	triangle: number;
	/** Value of each field asked for, interpolated in the triangle; null where there is none. */
	values: (number | null)[];
}

/** `gain`: change of the map's objective that the move makes, by area; `distance`: from another shape. */
export type FieldName = 'map' | 'move' | 'gain' | 'distance';

export interface Sight {
	origin: Vec3;
	direction: Vec3;
}

/** What a stroke of painting asks for. `on`: the surface that is hit; triangles are the same on both. */
export type Reach =
	| { kind: 'brush'; sights: Sight[]; on: 'rest' | 'moved'; radius: number }
	/** `angle`: radians between neighbours. */
	| { kind: 'fill'; sights: Sight[]; on: 'rest' | 'moved'; angle: number }
	| { kind: 'box'; box: DesignBox };

/** Displacement of some vertices. */
export interface VertexField {
	/** Ascending ids. */
	vertices: Uint32Array;
	/** Metres, x, y, z of each. */
	displacement: Float32Array;
}

/** Requests by name: what goes in and what comes out. */
export interface DisplayCalls {
	/** Takes the served bytes: float32 positions in the study's unit, uint32 triangles. */
	load: [{ positions: ArrayBuffer; triangles: ArrayBuffer; metresPerUnit: number }, DisplayMesh];
	/** A map's served bytes: float32 per metre per m^2; `scale` brings them to what is shown. */
	map: [{ values: ArrayBuffer; scale: number }, DisplayField];
	/** Another shape's served positions over the same triangles: how far this surface lies outside it along its normal, mm. */
	difference: [{ positions: ArrayBuffer; metresPerUnit: number }, DisplayField];
	/**
	 * Applies control point displacements (metres, nPoints x 3) to the loaded surface, or a displacement by vertex where it is
	 * given.
	 */
	move: [
		{ boxes: DesignBox[]; lattices: Float64Array[]; field?: VertexField | null; exaggeration: number },
		DisplayMove
	];
	/** The last move again, exaggerated otherwise. */
	exaggerate: [{ exaggeration: number }, DisplayMove];
	/**
	 * The map times the move's displacement along the normal: the objective's change to first order, per m^2 of surface. Needs
	 * both.
	 */
	gain: [Record<string, never>, DisplayField];
	histogram: [{ field: FieldName; extent: number; bins: number }, Float32Array];
	share: [{ box: DesignBox; field: FieldName | null }, Share];
	/** `on`: the surface that is hit. */
	pick: [{ origin: Vec3; direction: Vec3; on: 'rest' | 'moved'; fields: FieldName[] }, Pick | null];
	/** Ids of the triangles reached, ascending. */
	reach: [Reach, Uint32Array];
	/** By vertex, how much of a move locks take away: 1 all of it, 0 nothing. `blend` in metres. */
	spared: [{ locks: { triangles: Uint32Array; blend: number }[] }, Float32Array];
}

export type DisplayCall = keyof DisplayCalls;
export type DisplayInput<K extends DisplayCall> = DisplayCalls[K][0];
export type DisplayOutput<K extends DisplayCall> = DisplayCalls[K][1];

export interface DisplayRequest<K extends DisplayCall = DisplayCall> {
	id: number;
	call: K;
	input: DisplayInput<K>;
}

export type DisplayReply = { id: number; output: unknown } | { id: number; error: string };
