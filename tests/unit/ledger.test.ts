/** What the Ledger makes of shapes and results. */
import { describe, expect, it } from 'vitest';
import type { ShapeSummary } from '$lib/api/schemas/shapes';
import type { Objective, OperatingPoint } from '$lib/api/schemas/studies';
import { bestRow, ledgerRows, lineage, readLast } from '$lib/state/ledger';
import { ledgerCsv } from '$lib/state/ledger-csv';

const drag: Objective = {
	id: 'drag',
	name: 'Drag',
	unit: 'N',
	sense: 'minimise',
	weight: 1,
	position: 0,
	rehearsal: null
};
const point = (id: string, weight: number): OperatingPoint => ({
	id,
	name: id,
	speed: null,
	density: null,
	yaw: null,
	weight
});

type Found = Record<string, [value: number, uncertainty: number | null]>;

function shape(
	number: number,
	parent: number | null,
	predicted: number | null,
	found: Found = {},
	name = ''
): ShapeSummary {
	return {
		id: `s${number}`,
		studyId: 'study',
		number,
		parentId: parent === null ? null : `s${parent}`,
		name,
		note: '',
		state: parent === null ? 'baseline' : Object.keys(found).length ? 'judged' : 'open',
		volume: 0.4312,
		area: 5,
		closed: true,
		step: parent === null ? null : 0.004,
		smoothing: parent === null ? null : 0.025,
		maxDisplacement: null,
		rmsDisplacement: null,
		predicted: [{ objectiveId: 'drag', change: predicted }],
		results: Object.entries(found).map(([operatingPointId, [value, uncertainty]]) => ({
			id: `r${number}${operatingPointId}`,
			shapeId: `s${number}`,
			objectiveId: 'drag',
			operatingPointId,
			value,
			uncertainty,
			note: '',
			rehearsal: false,
			createdAt: '2026-01-01T00:00:00.000Z',
			createdBy: null
		})),
		mapCount: 0,
		createdAt: '2026-01-01T00:00:00.000Z',
		createdBy: null
	};
}

const one = [point('p', 1)];
const study = [
	shape(0, null, null, { p: [44.8, 0.3] }),
	shape(1, 0, -2, { p: [43, 0.4] }),
	shape(2, 1, -1.9, { p: [43.3, 0.1] }),
	shape(3, 1, -1, {})
];

describe('rows', () => {
	it('compare what was found with the parent and what was predicted', () => {
		const [base, first, second, third] = ledgerRows([...study].reverse(), 'drag', null, one);
		expect(base).toMatchObject({ value: 44.8, found: null, ratio: null, expected: null });
		expect(first.found).toBeCloseTo(-1.8, 12);
		expect(first.foundBand).toBeCloseTo(0.5, 12);
		expect(first.ratio).toBeCloseTo(0.9, 12);
		expect(second.ratio).toBeCloseTo(-0.3 / 1.9, 12);
		expect(third).toMatchObject({ value: null, found: null, ratio: null });
		expect(third.expected).toBeCloseTo(42, 12);
	});

	it('take the mean over operating points by weight, and none while a point is missing', () => {
		const points = [point('p', 3), point('q', 1), point('unused', 0)];
		const shapes = [shape(0, null, null, { p: [40, 0.4], q: [48, 0.4] }), shape(1, 0, -2, { p: [38, 0.4] })];
		const [base, child] = ledgerRows(shapes, 'drag', null, points);
		expect(base.value).toBeCloseTo(42, 12);
		expect(base.uncertainty).toBeCloseTo(Math.hypot(0.3, 0.1), 12);
		expect(child).toMatchObject({ value: null, found: null, predicted: -2 });
		// A prediction is of the mean: beside one point's value it would be compared with something else.
		expect(ledgerRows(shapes, 'drag', 'p', points)[1]).toMatchObject({
			value: 38,
			found: -2,
			predicted: null,
			ratio: null
		});
	});

	it('know the best shape and its ancestors', () => {
		const rows = ledgerRows(study, 'drag', null, one);
		expect(bestRow(rows, 'minimise')?.shape.number).toBe(1);
		expect(bestRow(rows, 'maximise')?.shape.number).toBe(0);
		expect([...lineage(rows, 's2')]).toEqual(['s2', 's1', 's0']);
	});
});

describe('what the last results mean', () => {
	const read = (predicted: number, found: number, band: number) =>
		readLast(
			ledgerRows(
				[shape(0, null, null, { p: [50, band] }), shape(1, 0, predicted, { p: [50 + found, 0] })],
				'drag',
				null,
				one
			),
			drag
		);

	it('says nothing about the step within the noise', () => {
		expect(read(-2, -0.3, 0.4)?.says).toContain('within the solver’s noise');
	});

	// The bands: Nocedal and Wright, Numerical Optimization, 2nd ed. (2006), Algorithm 4.1.
	it.each([
		[-0.2, 'Take half the step'],
		[-1, 'Keep the same step, 4.00'],
		[-1.6, 'up to twice'],
		[-4, 'sign, unit and scale']
	])('of −2 N predicted, %d N found', (found, next) => {
		expect(read(-2, found, 0.01)?.next.replaceAll('\u00a0', ' ')).toContain(next);
	});

	it('goes back to the parent after an overshoot', () => {
		const reading = read(-2, 0.5, 0.1);
		expect(reading?.says).toContain('overshot');
		expect(reading?.from.number).toBe(0);
	});

	it('is silent before a child has a result', () => {
		expect(readLast(ledgerRows([study[0]], 'drag', null, one), drag)).toBeNull();
	});
});

// RFC 4180: CRLF between records, quotes doubled within quotes.
it('CSV keeps names apart from formulas and numbers from rounding noise', () => {
	const rows = ledgerRows(
		[shape(0, null, null, { p: [44.8, 0.35] }, 'a "quoted", name'), shape(1, 0, -2, { p: [43.34, null] }, '=1+1')],
		'drag',
		null,
		one
	);
	const [head, base, child, end] = ledgerCsv(rows, drag, one[0]).split('\r\n');
	expect(head.startsWith('shape,name,from,step [mm]')).toBe(true);
	expect(base).toContain('0,"a ""quoted"", name",,');
	expect(child).toBe("1,'=1+1,0,4,25,-2,-1.46,0.35,0.73,43.34,,0.4312,judged");
	expect(end).toBe('');
});
