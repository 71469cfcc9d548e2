import { describe, expect, it } from 'vitest';
import { boxCreate } from '$lib/api/schemas/drawn';
import { userCreate } from '$lib/api/schemas/people';
import { objectiveCreate, operatingPointCreate, studyCreate } from '$lib/api/schemas/studies';
import { readStl } from '$lib/morph';
import { demoPlan, foundShare } from '$lib/server/demo/plan';
import { readSoup } from '../../factories/stl';

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

	it('brings its baseline as an STL of four solids', () => {
		const bytes = demoPlan.baseline.bytes();
		const soup = readSoup(bytes);
		expect(soup.solids.map(({ name }) => name)).toEqual(['shell', 'floor', 'feet', 'tail']);
		const mesh = readStl(bytes);
		expect(mesh.encoding).toBe('ascii');
		expect(mesh.patches.map(({ name, triangleCount }) => ({ name, triangleCount }))).toEqual(soup.solids);
		const corners = Float32Array.from(
			soup.corners,
			(_, k) => mesh.positions[3 * mesh.triangles[Math.floor(k / 3)] + (k % 3)]
		);
		expect(Buffer.from(corners.buffer).equals(Buffer.from(soup.corners.buffer))).toBe(true);
	}, 60_000);

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
