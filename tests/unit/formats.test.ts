/** Numbers, units and lengths as the screens write and read them. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { fixed, parseNumber, plain, plural, sensible, signed, signedPercent } from '$lib/format/numbers';
import {
	direction,
	length,
	metresPerUnit,
	objectiveChange,
	objectiveValue,
	parseLength,
	volume
} from '$lib/format/units';
import { initials } from '$lib/format/words';
import type { LengthUnit } from '$lib/api/schemas/common';

/** Spaces that hold number and unit together, as plain ones. */
const text = (s: string) => s.replaceAll('\u00a0', ' ');

describe('numbers', () => {
	it('write the minus sign and no sign for zero', () => {
		expect(fixed(-1.42, 2)).toBe('\u22121.42');
		expect(fixed(-0.001, 2)).toBe('0.00');
		expect(signed(0.001, 2)).toBe('0.00');
		expect(signed(1.5, 1)).toBe('+1.5');
		expect(text(signedPercent(-0.0982))).toBe('\u22129.8 %');
	});

	it('keep the figures they are asked for', () => {
		expect(sensible(0.00123456, 3)).toBe('0.00123');
		expect(sensible(9.9996, 4)).toBe('10.00');
		expect(sensible(-2.5e-9, 3)).toBe('\u22122.50e\u22129');
		expect(plain(25)).toBe('25');
		expect(plain(0.42)).toBe('0.42');
		expect(text(plural(1, 'shape'))).toBe('1 shape');
		expect(text(plural(40212, 'shape'))).toBe('40,212 shapes');
	});

	it('are read back as they are written', () => {
		fc.assert(
			fc.property(fc.double({ min: -1e6, max: 1e6, noNaN: true }), (x) => {
				expect(parseNumber(fixed(x, 6))).toBeCloseTo(x, 5);
			})
		);
	});

	it('are read with a decimal comma, with grouping, and not at all when they are none', () => {
		expect(parseNumber('0,35')).toBe(0.35);
		expect(parseNumber('1,234.5')).toBe(1234.5);
		expect(parseNumber(' −4e-1 ')).toBe(-0.4);
		for (const none of ['', 'abc', '1 N', '--2', '1.2.3']) expect(parseNumber(none)).toBeNaN();
	});
});

describe('units', () => {
	it('put metres, cubic metres and values with their bands into words', () => {
		expect(text(length(0.004))).toBe('4.00 mm');
		expect(text(length(0.025))).toBe('25.0 mm');
		expect(text(length(0.0254, 'in', 2))).toBe('1.00 in');
		expect(length(null)).toBe('–');
		expect(text(volume(0.4312))).toBe('431.20 L');
		expect(text(volume(2e-5))).toBe('20.00 cm³');
		expect(text(objectiveValue(44.8, 'N', 0.35))).toBe('44.80 ± 0.35 N');
		expect(text(objectiveChange(-1.42, 'N'))).toBe('\u22121.42 N');
		expect(text(objectiveChange(0.0123, '1'))).toBe('+0.0123');
	});

	// The inch is 25.4 mm exactly, the foot 304.8 mm: international yard and pound agreement, 1959.
	it('read lengths with the unit that was typed, or the field’s own', () => {
		expect(parseLength('4', 'mm')).toBeCloseTo(0.004, 15);
		expect(parseLength('4.0 mm', 'm')).toBeCloseTo(0.004, 15);
		expect(parseLength('1in', 'mm')).toBeCloseTo(0.0254, 15);
		expect(parseLength('1 ft', 'mm')).toBeCloseTo(0.3048, 15);
		expect(parseLength('1 yd', 'mm')).toBeNaN();
		expect(parseLength('four', 'mm')).toBeNaN();
		fc.assert(
			fc.property(
				fc.constantFrom<LengthUnit>('m', 'mm', 'cm', 'in'),
				fc.double({ min: 0.001, max: 1000, noNaN: true }),
				(unit, x) => {
					expect(parseLength(`${x.toFixed(6)} ${unit}`, 'mm') / metresPerUnit[unit]).toBeCloseTo(x, 5);
				}
			)
		);
	});

	it('say which way a change goes', () => {
		expect(direction(-1, 'minimise')).toBe(1);
		expect(direction(-1, 'maximise')).toBe(-1);
		expect(direction(-1, 'hold')).toBe(0);
	});
});

it('initials are of the first and the last name', () => {
	expect(initials('Mara Ebner')).toBe('ME');
	expect(initials('ada  van  der  Byl')).toBe('AB');
	expect(initials('Tilde')).toBe('T');
});
