/**
 * Inequalities at single places of the surface (a clearance, a wall's thickness), linearised at given positions: for
 * each place, slack + sum over its terms of vector . (change of the vertex's position) >= 0. Lengths in metres.
 */
export interface PlaceRows {
	/** Places. */
	count: number;
	/** count + 1 offsets into the terms. */
	starts: Uint32Array;
	/** Terms: vertex ids. */
	vertices: Uint32Array;
	/** Terms x 3: gradient of the slack. */
	vectors: Float64Array;
	/** Value less limit at the given positions; below 0 is broken. */
	slack: Float64Array;
	/** The value itself: distance, thickness. */
	values: Float64Array;
}

/** A constraint that acts vertex by vertex. */
export interface PlaceConstraint {
	/**
	 * The places whose slack lies below `within` at these positions.
	 * @param positions N x 3, all vertices of the surface, moved or not; borrowed
	 * @param within metres
	 */
	rows(positions: Float64Array, within: number): PlaceRows;
}

/** What makes the constraint for some vertices: a prepared keep-out, the rays of a wall. */
export interface PlaceSource {
	/** @param vertices ascending ids */
	place(vertices: Uint32Array): PlaceConstraint;
}
