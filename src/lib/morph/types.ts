import type { PlaceSource } from './place-rows';

/**
 * Called regularly by long work with the fraction done (0..1). The caller may report it, and may throw from it to
 * cancel: nothing is left half done, since every function returns fresh arrays.
 */
export type Checkpoint = (fraction: number) => void;

export interface WithCheckpoint {
	checkpoint?: Checkpoint;
}

export type StlEncoding = 'binary' | 'ascii';

/** A named run of consecutive triangles: an STL solid. Patches follow each other and cover all triangles. */
export interface Patch {
	name: string;
	firstTriangle: number;
	triangleCount: number;
}

/** A welded triangle mesh as it stands in a file. */
export interface Mesh {
	/** N x 3, row by row, in the file's own length unit; never -0. */
	positions: Float32Array;
	/** F x 3 vertex indices, counter-clockwise seen from outside, in the file's order. */
	triangles: Uint32Array;
	patches: Patch[];
	/** F attribute words of a binary STL when any of them is not zero (and not our own patch numbers); else null. */
	attributes: Uint16Array | null;
	encoding: StlEncoding;
}

export interface Bounds {
	min: [number, number, number];
	max: [number, number, number];
}

/** What the import and the shape's page say about a surface. Lengths in the unit of the positions. */
export interface SurfaceMeasures {
	vertexCount: number;
	triangleCount: number;
	area: number;
	/** Signed, by the divergence theorem; meaningful for a closed surface only. */
	volume: number;
	/** No boundary edge, no edge of more than two triangles, every edge used once in each direction. */
	closed: boolean;
	/** Edges used by one triangle. */
	boundaryEdges: number;
	/** Edges used by more than two triangles. */
	nonManifoldEdges: number;
	/** Edges used by two triangles in the same direction (neighbours of opposite orientation). */
	inconsistentEdges: number;
	/** Triangles with two equal corners or zero area. */
	degenerateTriangles: number;
	/** Vertices used by no triangle. */
	unusedVertices: number;
	bounds: Bounds;
	/** Area centroid. */
	centroid: [number, number, number];
	meanEdge: number;
}

/** A surface in metres with the fields that the move needs. Arrays are owned by the object and must not be changed. */
export interface Surface {
	/** N x 3, metres. */
	positions: Float64Array;
	/** F x 3. */
	triangles: Uint32Array;
	/** N lumped masses: one third of the area of the triangles at the vertex, m^2. */
	mass: Float64Array;
	/** N x 3 unit normals weighted by area; (0,0,0) where a vertex has no area. */
	normals: Float64Array;
	/** N x 3, dV/dx: m^2. */
	volumeGradient: Float64Array;
	/** m^2 */
	area: number;
	/** m^3, signed. */
	volume: number;
	/**
	 * Every edge is used equally often in both directions (edges in the symmetry plane of a half model aside), so that the
	 * volume does not depend on the origin.
	 */
	watertight: boolean;
	/** What the volume is summed about: near the surface; on the symmetry plane of a half model. */
	origin: [number, number, number];
}

/** Plane of mirror symmetry, metres. */
export interface SymmetryPlane {
	point: [number, number, number];
	/** Unit. */
	normal: [number, number, number];
}

export type MapLocation = 'vertex' | 'face';
export type MapKind = 'density' | 'nodal' | 'vector';

/** A table of points with one or three values each, as read from a file. */
export interface MapTable {
	/** M x 3, in the file's length unit. */
	points: Float64Array;
	/** M (components 1) or M x 3 (components 3). */
	values: Float64Array;
	components: 1 | 3;
	rows: number;
	/** Line in the file (from 1) of each row. */
	lines: Uint32Array;
	/** The header's names when the file has one. */
	header: string[] | null;
}

export interface MatchOptions extends WithCheckpoint {
	location: MapLocation;
	kind: MapKind;
	/** Distance within which a point is the vertex (or the face's centroid); default 1e-5 of the bounds' diagonal. */
	tolerance?: number;
	/** Farthest distance to the surface at which a point is still used; default twice the mean edge length. */
	limit?: number;
}

/** A map brought onto a mesh. What got no value holds 0 and is counted. */
export interface MapMatch {
	/** Per vertex or per face: n (density, nodal) or n x 3 (vector). */
	values: Float64Array;
	location: MapLocation;
	kind: MapKind;
	components: 1 | 3;
	/** Rows used, at their exact place and by the nearest point on the surface. */
	matched: number;
	exact: number;
	/** Rows beyond the limit, left out. */
	unmatched: number;
	/** Data rows (from 1) of the first unmatched rows, at most 20. */
	unmatchedRows: number[];
	/** Over the used rows, in the mesh's length unit. */
	maxDistance: number;
	distancePercentiles: { p50: number; p90: number; p99: number };
	/** Share (0..1) of the surface's area whose vertices (faces) got a value. */
	coverage: number;
	/** Vertices or faces without a value. */
	withoutValue: number;
	/** Area without a value, mesh unit squared. */
	unmatchedArea: number;
}

export type Axis = 'x' | 'y' | 'z';
export type BasisKind = 'bernstein' | 'bspline';

/** Planes of control points held at each face: 0 none, 1 joins continuously, 2 with its tangent, 3 with its curvature. */
export interface HeldPlanes {
	u0: number;
	u1: number;
	v0: number;
	v1: number;
	w0: number;
	w1: number;
}

/** An oriented box carrying a lattice. Lengths in metres. */
export interface DesignBox {
	id: string;
	name?: string;
	centre: [number, number, number];
	halfSize: [number, number, number];
	/** Unit quaternion [x, y, z, w] that turns the world's axes into the box's. */
	rotation: [number, number, number, number];
	/** Control points along u, v, w: 2..20 each, at most 4000 in all. */
	lattice: [number, number, number];
	basis: BasisKind;
	/** B-spline degree 1..3; ignored for Bernstein, whose degree is points - 1 by axis. */
	degree?: number;
	held: HeldPlanes;
	/** Single control points held, ((i*nv)+j)*nw+k; default none. */
	heldPoints?: readonly number[];
	/** Axes along which control points may move. */
	axes: Axis[];
	/** Whose axes those are. */
	frame: 'box' | 'world';
}

/** The vertices inside a box and their coordinates in it. */
export interface Embedding {
	/** n vertex indices, ascending. */
	inside: Uint32Array;
	/** n x 3, each in [0, 1]. */
	uvw: Float64Array;
}

export type Sense = 'minimise' | 'maximise' | 'hold';
export type Bound = 'hold' | 'atLeast' | 'atMost';

export interface MoveObjective {
	id: string;
	/** N x 3, objective per metre; borrowed. */
	gradient: Float64Array;
	sense: Sense;
	weight: number;
}

export type MoveConstraint =
	| {
			kind: 'volume';
			bound: Bound;
			/** m^3; default: the parent's volume. */
			value?: number;
			/** Triangles that bound the part meant, ascending; default the whole body. */
			part?: Uint32Array;
	  }
	| {
			kind: 'objective';
			objectiveId: string;
			bound: Bound;
			/** Bound of the predicted change of the objective over this move, in its unit; default 0. */
			value?: number;
	  }
	| PlaceBound;

/** Displacement along the parent's outward normal, metres: at least -inward, at most outward. */
export interface DisplacementBound {
	kind: 'displacement';
	/** >= 0; how far inward a vertex may go. */
	inward?: number;
	/** >= 0; how far outward. */
	outward?: number;
	/** Vertices meant, ascending; default all that move. */
	vertices?: Uint32Array;
}

/** An inequality at every vertex: kept by rounds that add the violated places. */
export type PlaceBound =
	| DisplacementBound
	| {
			kind: 'keepOut' | 'thickness';
			/** Says which in messages: the keep-out's name. */
			label: string;
			/** The limit, metres: clearance, least thickness. */
			limit: number;
			source: PlaceSource;
			/** Vertices meant, ascending; default all that move. */
			vertices?: Uint32Array;
	  };

export interface MoveRequest extends WithCheckpoint {
	/** All objectives: those of weight 0 or sense 'hold' are predicted but do not steer. */
	objectives: MoveObjective[];
	/** Largest displacement of any vertex by the computed move, metres, > 0. */
	step: number;
	constraints: MoveConstraint[];
	/**
	 * Lattice displacements made by hand, by box in the order given (nPoints x 3, metres, world axes; null: none). Added to the
	 * computed move, which then also makes good what they do to the constraints.
	 */
	hand?: (Float64Array | null)[];
}

export interface PrepareOptions extends WithCheckpoint {
	/** 'lattice' (default): control points move the surface; 'surface': every vertex in the boxes along its normal. */
	mode?: 'lattice' | 'surface';
	/** Smoothing length r in metres, >= 0. */
	smoothing: number;
	/** Regularisation of the metric: eps times its mean diagonal is added to the diagonal. Default 1e-6. */
	eps?: number;
	/** N weights in [0, 1] by vertex (locks, blends); default all 1. Borrowed. */
	weights?: Float64Array;
	/**
	 * Mirror symmetry: every lattice and its mirror image are tied, images that are no given box are added, and vertices on
	 * the plane stay on it. Default none.
	 */
	symmetry?: SymmetryPlane;
	/** How sums over vertices are formed; 'auto' takes the cheaper. Both give the same within 5e-8 of the step (docs/numerics.md). */
	path?: 'auto' | 'direct' | 'moments';
}

export interface ConstraintReport {
	/** Index of the constraint in the request; a displacement bound has a report for each side. */
	index: number;
	kind: MoveConstraint['kind'];
	objectiveId?: string;
	bound: Bound;
	/** The bound itself: m^3, change in the objective's unit, metres. */
	limit: number;
	/** At places: the worst of the vertices meant, null when none comes near the limit; 0 for displacements. */
	before: number | null;
	after: number | null;
	/** Whether it is kept, to the tolerance that docs/numerics.md names. A move by hand alone may break it. */
	kept: boolean;
	/** Places at which it binds. */
	places?: number;
	/** Where `after` is found, metres. */
	place?: [number, number, number] | null;
	/** Whether it binds. */
	active: boolean;
	/**
	 * Lagrange multiplier: the gain (decrease) of the weighted objective for one unit of relaxation, at the same length
	 * of the move in the metric. For atLeast, atMost: >= 0. For hold: the gain by raising the held value; a negative
	 * price says that lowering it gains.
	 */
	price: number;
}

export interface MoveSolution {
	/**
	 * By box as in `PreparedMove.boxes`: displacement of its control points, metres, world axes, nPoints x 3,
	 * ((i*nv)+j)*nw+k; empty in surface mode.
	 */
	lattices: Float64Array[];
	/** Vertices in any box, ascending. */
	moved: Uint32Array;
	/** moved.length: position in `moved` of each vertex's mirror image, -1 where it has none; null without symmetry. */
	partners: Int32Array | null;
	/** moved.length x 3, metres. */
	displacement: Float64Array;
	/** First-order change of each objective, in the order given. */
	predicted: { objectiveId: string; change: number }[];
	/** First-order change of the weighted objective that was descended. */
	predictedWeighted: number;
	maxDisplacement: number;
	/** Root mean square over the vertices in the boxes. */
	rmsDisplacement: number;
	/** m^3 */
	volumeBefore: number;
	/** m^3, of the float64 surface. */
	volumeAfter: number;
	constraints: ConstraintReport[];
	/** Length of the move in the metric, sqrt(d'Hd). */
	metricLength: number;
	/** The descent's length factor a in d = -a H^-1 (g - C' lambda). */
	stepFactor: number;
}

/** What a hand-made lattice displacement does: same map to the surface, same prediction. */
export type HandMove = Omit<MoveSolution, 'metricLength' | 'stepFactor'>;

/** Keeps the embedding, the moments and the factor of a surface with its boxes. */
export interface PreparedMove {
	/** The boxes given, then the mirror images that symmetry added. */
	readonly boxes: readonly DesignBox[];
	/** Vertices in any box, ascending. */
	readonly moved: Uint32Array;
	/** Vertices in each box. */
	readonly insideCounts: readonly number[];
	/** Control points that may move, by box. */
	readonly freePoints: readonly number[];
	/** Unknowns of the small system (control points times axes). */
	readonly unknowns: number;
	readonly path: 'direct' | 'moments';
	/** Only the small system and sums over the boxes' vertices: quick enough for a slider. */
	solve(request: MoveRequest): MoveSolution;
	/**
	 * Lattice displacements by given box (nPoints x 3, metres, world axes), applied as they are; constraints are reported, not
	 * enforced.
	 */
	applyByHand(lattices: (Float64Array | null)[], objectives: MoveObjective[], constraints?: MoveConstraint[]): HandMove;
}

export interface StoredPositions {
	/** N x 3, in the file's unit. */
	positions: Float32Array;
	/** Of the stored surface, m^3. */
	volume: number;
	/** Coordinates nudged by one ulp to hold the volume. */
	nudges: number;
	/** |volume - target| / |target| when a target was given, else 0. */
	volumeError: number;
}

export interface CheckResult {
	value: number;
	limit: number;
	/** value keeps the limit. */
	ok: boolean;
	/** A move that breaks it must not be committed. */
	hard: boolean;
	/** How many triangles (vertices, pairs: as the check says) break the limit. */
	count: number;
	/** Worst place: triangle index and a point on it in metres; null when nothing was looked at. */
	place: { triangle: number; position: [number, number, number] } | null;
	/** The same value of the parent, where the check compares with it. */
	before?: number;
	/** Which of several things the value belongs to: the keep-out's name. */
	label?: string;
}

/** Each is there when it was asked for and there was something to look at. */
export interface MoveChecks {
	/** Triangles whose normal turned by more than 90 degrees against the parent. */
	flipped: CheckResult;
	/** Smallest interior angle of the moved triangles, degrees. */
	minAngle: CheckResult;
	/** Area over the parent's of the moved triangle that grew or shrank most, and the limit on its side. */
	areaRatio?: CheckResult;
	/** Pairs of triangles, at least one of them moved, that cross and did not in the parent; `before`: those that did. */
	selfIntersection?: CheckResult;
	/** Thinnest wall under a moved vertex, m; counted are vertices that are thinner than the limit and than they were. */
	thickness?: CheckResult;
	/** Distance to the keep-out that is nearest to being broken, m, and its clearance; counted are vertices and triangles. */
	keepOut?: CheckResult;
	/** Smallest radius of convex curvature at a moved vertex, m; counted are vertices below the limit and sharper than before. */
	radius?: CheckResult;
}
