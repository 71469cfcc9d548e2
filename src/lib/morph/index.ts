/** The engine's public door. Everything else in this folder is private to it. */
export { MorphError, type MorphErrorCode, type MorphPlace } from './errors';
export type * from './types';
export { readStl, type ReadStlOptions } from './stl-read';
export { binaryKeepsPatchNames, stlByteLength, stlChunks, writeStl, type WriteStlOptions } from './stl-write';
export { float32Text } from './float-text';
export { weldTriangles } from './weld';
export { surfaceMeasures } from './measures';
export { geometry, makeSurface, meshToSurface, toMetres, volumeGradient, volumeOf } from './surface';
export { readMapCsv } from './map-csv';
export { matchMap } from './map-match';
export { displayDensity, mapTotal, nodalGradient, type NodalMap } from './nodal';
export { checkBox, controlPoints, embed, pointIndex } from './box';
export { computeMove, prepareMove } from './move';
export { helmholtz, solveSparse, type SparseMatrix } from './laplacian';
export { mirrorBox } from './symmetry';
export { latticeMotion, type LatticeMotion } from './motion';
export { applyDisplacement, storePositions } from './store';
export { checkMove, USUAL_AREA_RATIO, USUAL_LEAST_RADIUS, type CheckMoveInput } from './checks';
export { edgeTable, type EdgeTable } from './half-edges';
export { type PlaceConstraint, type PlaceRows, type PlaceSource } from './place-rows';
export {
	prepareKeepOut,
	type KeepOutGeometry,
	type KeepOutSide,
	type Penetration,
	type PreparedKeepOut
} from './keep-out';
export { lockWeights, type SurfaceLock } from './locks';
export { patchVolume, type PartSurface } from './part-volume';
export { CurvatureProbe, smallestRadii, type Curvatures, type RadiusPlace } from './curvature';
export { prepareThickness, type PreparedThickness, type ThicknessOptions } from './thickness';
export { rehearse, type Rehearsal, type RehearsalKind, type RehearsalSpec } from './rehearsal';
export { selfIntersections, type SelfIntersectionOptions, type SelfIntersections } from './self-intersection';
export { TriangleTree } from './triangle-tree';
