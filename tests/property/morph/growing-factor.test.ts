import fc from 'fast-check';
import { Matrix, solve } from 'ml-matrix';
import { describe, expect, it } from 'vitest';
import { GrowingFactor } from '../../../src/lib/morph/growing-factor';
import { sequence } from '../../factories/numbers';

describe('a Cholesky factor whose rows come and go', () => {
	it('solves as elimination does, after any additions and removals', () => {
		const steps = fc.array(fc.nat(), { minLength: 1, maxLength: 60 });
		fc.assert(
			fc.property(fc.nat(), steps, (seed, choices) => {
				const next = sequence(seed);
				// Inner products of random vectors, so that all subsets are positive definite.
				const count = 15;
				const vectors = Array.from({ length: count }, () => Array.from({ length: 25 }, next));
				const gram = vectors.map((a) => vectors.map((b) => a.reduce((s, x, k) => s + x * b[k], 0)));
				const factor = new GrowingFactor();
				let held: number[] = [];
				for (const choice of choices) {
					const outside = gram.map((_, i) => i).filter((i) => !held.includes(i));
					if (held.length > 0 && (choice % 3 === 0 || outside.length === 0)) {
						const at = choice % held.length;
						factor.drop(at);
						held = held.filter((_, k) => k !== at);
					} else {
						const i = outside[choice % outside.length];
						const y = factor.forward(held.map((j) => gram[j][i]));
						factor.add(
							y,
							y.reduce((rest, v) => rest - v * v, gram[i][i])
						);
						held.push(i);
					}
					expect(factor.size).toBe(held.length);
					if (held.length === 0) continue;
					const right = held.map(() => next());
					const wanted = solve(
						new Matrix(held.map((i) => held.map((j) => gram[i][j]))),
						Matrix.columnVector(right)
					).to1DArray();
					const found = factor.solve(right);
					const scale = Math.max(...wanted.map(Math.abs));
					wanted.forEach((w, k) => expect(Math.abs(found[k] - w)).toBeLessThan(1e-9 * scale));
				}
			})
		);
	});
});
