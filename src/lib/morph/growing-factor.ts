/**
 * Cholesky factor of a Gram matrix whose rows come and go: adding one costs a substitution, dropping one a sweep of plane
 * rotations (Golub and Van Loan, Matrix Computations, 6.5.4), instead of a factorisation each.
 */
export class GrowingFactor {
	/** Row i of the lower triangle; entries beyond i are left over and not read. */
	private readonly rows: Float64Array[] = [];

	get size(): number {
		return this.rows.length;
	}

	/** L^-1 of a right side; its squared length is what the rows in the factor explain of a row with these inner products. */
	forward(right: ArrayLike<number>): Float64Array {
		const { rows } = this;
		const y = Float64Array.from(right);
		for (let i = 0; i < rows.length; i++) {
			const row = rows[i];
			let sum = y[i];
			for (let k = 0; k < i; k++) sum -= row[k] * y[k];
			y[i] = sum / row[i];
		}
		return y;
	}

	/** L^-T, in place. */
	back(y: Float64Array): Float64Array {
		const { rows } = this;
		for (let i = rows.length - 1; i >= 0; i--) {
			const row = rows[i];
			const x = y[i] / row[i];
			y[i] = x;
			for (let k = 0; k < i; k++) y[k] -= row[k] * x;
		}
		return y;
	}

	solve(right: ArrayLike<number>): Float64Array {
		return this.back(this.forward(right));
	}

	/**
	 * @param y forward() of the new row's inner products with those in the factor
	 * @param apart its squared length less that of y, > 0
	 */
	add(y: Float64Array, apart: number): void {
		const row = new Float64Array(y.length + 1);
		row.set(y);
		row[y.length] = Math.sqrt(apart);
		this.rows.push(row);
	}

	drop(index: number): void {
		const { rows } = this;
		rows.splice(index, 1);
		// Each row behind reaches one entry beyond the diagonal now.
		for (let c = index; c < rows.length; c++) {
			const length = Math.hypot(rows[c][c], rows[c][c + 1]);
			const cosine = rows[c][c] / length;
			const sine = rows[c][c + 1] / length;
			for (let i = c; i < rows.length; i++) {
				const row = rows[i];
				const a = row[c];
				const b = row[c + 1];
				row[c] = cosine * a + sine * b;
				row[c + 1] = cosine * b - sine * a;
			}
		}
	}
}
