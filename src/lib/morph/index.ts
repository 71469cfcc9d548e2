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
export { latticeMotion, type LatticeMotion } from './motion';
export { applyDisplacement, storePositions } from './store';
export { checkMove, type CheckMoveInput } from './checks';
