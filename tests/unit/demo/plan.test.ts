import { describe, expect, it } from 'vitest';
import { boxCreate, objectiveCreate, operatingPointCreate, studyCreate, userCreate } from '$lib/api/schemas';
import { readStl } from '$lib/morph';
import { demoPlan, foundShare } from '$lib/server/demo/plan';
import { podSurface } from '$lib/server/demo/pod-mesh';

describe('the demo plan', () => {
	it('is made of requests that the API accepts', () => {
		expect(studyCreate.parse(demoPlan.study).lengthUnit).toBe('mm');
		expect(demoPlan.objectives.map(({ create }) => objectiveCreate.parse(create).sense)).toEqual(['minimise', 'hold']);
		expect(demoPlan.operatingPoints.map((point) => operatingPointCreate.parse(point).speed)).toEqual([25]);
		expect(demoPlan.boxes.map(({ create }) => boxCreate.parse(create).lattice)).toEqual([
			[7, 5, 5],
			[7, 5, 4]
		]);
		expect(demoPlan.users.map((user) => user.role).sort()).toEqual(['admin', 'engineer', 'reviewer', 'viewer']);
		for (const { name, email, password } of demoPlan.users) {
			expect(userCreate.parse({ name, email, password }).email).toBe(email);
		}
	});

	it('brings its baseline as an STL of four solids that reads back as the pod', () => {
		const pod = podSurface();
		const bytes = demoPlan.baseline.bytes();
		const mesh = readStl(bytes);
		expect(mesh.encoding).toBe('ascii');
		expect(mesh.patches).toEqual(pod.patches);
		expect(mesh.positions.length).toBe(pod.positions.length);
		// The reader numbers vertices as they come; the corners themselves are the same floats.
		const corners = (surface: { positions: Float32Array; triangles: Uint32Array }) =>
			Float32Array.from(surface.triangles, (v) => surface.positions[3 * v] + surface.positions[3 * v + 1]);
		expect(Buffer.from(corners(mesh).buffer).equals(Buffer.from(corners(pod).buffer))).toBe(true);
	});

	it('finds 80 to 90 % of a prediction, less of a longer one', () => {
		expect(foundShare(0)).toBeCloseTo(0.9);
		expect(foundShare(-1)).toBeCloseTo(0.85);
		expect(foundShare(-1)).toBe(foundShare(1));
		expect(foundShare(-20)).toBeGreaterThan(0.8);
		const baseline = demoPlan.results(0, null, null);
		expect(baseline[0]).toMatchObject({ objective: 'drag', value: 44.8, uncertainty: 0.35 });
		expect(baseline[0].note).toMatch(/invented/i);
		const next = demoPlan.results(1, { drag: -1, lift: 0.5 }, { drag: 44.8, lift: -3.1 });
		expect(next.map((result) => result.value)).toEqual([43.95, -2.66]);
		expect(() => demoPlan.results(1, { drag: -1, lift: 0 }, null)).toThrow(/shape 1/);
	});
});
