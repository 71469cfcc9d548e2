/** A repeatable sequence of numbers in (-1, 1) (linear congruential, Numerical Recipes' constants). */
export function sequence(seed: number): () => number {
	let state = seed >>> 0;
	return () => {
		state = (Math.imul(state, 1664525) + 1013904223) >>> 0;
		return state / 2 ** 31 - 1;
	};
}

/**
 * Orders at which the remainder |J(x + h d) - J(x) - h grad J . d| falls when h is halved: 2 for an exact gradient of a smooth
 * function, 1 for a wrong one (Taylor's theorem; standard practice for verifying gradients).
 */
export function taylorOrders(
	value: (x: Float64Array) => number,
	x: Float64Array,
	gradient: ArrayLike<number>,
	direction: Float64Array,
	steps: readonly number[]
): number[] {
	const before = value(x);
	let slope = 0;
	for (let i = 0; i < direction.length; i++) slope += gradient[i] * direction[i];
	const rest = steps.map((h) => Math.abs(value(x.map((v, i) => v + h * direction[i])) - before - h * slope));
	return rest.slice(1).map((r, k) => Math.log(rest[k] / r) / Math.log(steps[k] / steps[k + 1]));
}
