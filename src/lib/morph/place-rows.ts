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

/** Collects rows whose number is not known before. */
export class PlaceRowsBuilder {
	private places = 0;
	private terms = 0;
	private starts = new Uint32Array(65);
	private vertices = new Uint32Array(64);
	private vectors = new Float64Array(192);
	private slack = new Float64Array(64);
	private values = new Float64Array(64);

	/** One term of the place that the next `place` closes. */
	term(vertex: number, x: number, y: number, z: number): void {
		if (this.terms === this.vertices.length) {
			this.vertices = grown(this.vertices, new Uint32Array(2 * this.terms));
			this.vectors = grown(this.vectors, new Float64Array(6 * this.terms));
		}
		this.vertices[this.terms] = vertex;
		const o = 3 * this.terms++;
		this.vectors[o] = x;
		this.vectors[o + 1] = y;
		this.vectors[o + 2] = z;
	}

	/** Closes a place with the terms since the last one. */
	place(slack: number, value: number): void {
		if (this.places === this.slack.length) {
			this.slack = grown(this.slack, new Float64Array(2 * this.places));
			this.values = grown(this.values, new Float64Array(2 * this.places));
			this.starts = grown(this.starts, new Uint32Array(2 * this.places + 1));
		}
		this.slack[this.places] = slack;
		this.values[this.places] = value;
		this.starts[++this.places] = this.terms;
	}

	/** The rows, as copies of their exact length. */
	rows(): PlaceRows {
		return {
			count: this.places,
			starts: this.starts.slice(0, this.places + 1),
			vertices: this.vertices.slice(0, this.terms),
			vectors: this.vectors.slice(0, 3 * this.terms),
			slack: this.slack.slice(0, this.places),
			values: this.values.slice(0, this.places)
		};
	}
}

function grown<T extends Uint32Array | Float64Array>(from: T, to: T): T {
	to.set(from);
	return to;
}
