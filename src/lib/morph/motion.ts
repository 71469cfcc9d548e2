import { BoxOperator } from './operator';
import type { DesignBox } from './types';

/** How one box's lattice moves a surface's vertices: the embedding is made once and kept. */
export interface LatticeMotion {
	/** n vertices inside the box, ascending. */
	readonly inside: Uint32Array;
	/**
	 * @param lattice displacement of the control points, metres, nPoints x 3, ((i*nv)+j)*nw+k, borrowed
	 * @returns displacement of the vertices inside, metres, n x 3
	 */
	displace(lattice: Float64Array): Float64Array;
}

/**
 * Moves vertices by a lattice without a metric, constraints or a prediction: what a page needs to show a move whose lattices
 * it was given. The same operator as in `prepareMove`, by the cheaper of its two paths (equal within 1e-8).
 * @param positions N x 3, metres, borrowed
 */
export function latticeMotion(positions: Float64Array, box: DesignBox): LatticeMotion {
	const operator = new BoxOperator(box, { positions }, undefined, 'auto');
	return { inside: operator.inside, displace: (lattice) => operator.evaluate(lattice) };
}
