declare module 'numeric' {
	export interface QpResult {
		/** 1-based: entry 0 is undefined in intermediate arrays, but the returned solution is 0-based. */
		solution: number[];
		value: number[];
		unconstrained_solution: number[];
		iterations: number[];
		iact: number[];
		message: string;
	}

	interface Numeric {
		/**
		 * Goldfarb-Idnani dual method: min -d'x + 1/2 x'Dx subject to A'x >= b, the first meq rows as equalities.
		 * Amat is n x m (one column per constraint).
		 */
		solveQP(
			Dmat: number[][],
			dvec: number[],
			Amat: number[][],
			bvec: number[],
			meq?: number,
			factorized?: unknown
		): QpResult;
	}

	const numeric: Numeric;
	export default numeric;
}
