import { expect, it } from 'vitest';
import { USUAL_LEAST_RADIUS } from '$lib/morph';
import { leastRadius } from '$lib/state/bench-words';

// UN Regulation No. 26, external projections of M1 vehicles: radius of curvature not less than 2.5 mm (summaries of the regulation).
it('the Bench suggests the reference that the engine names', () => {
	expect(leastRadius.usual).toBe(USUAL_LEAST_RADIUS);
	expect(leastRadius.usual).toBe(0.0025);
});
