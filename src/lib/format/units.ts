/** Lengths, areas and volumes are metres everywhere inside; here they get the unit that people read. */
import type { LengthUnit } from '$lib/api/schemas/common';
import type { Objective } from '$lib/api/schemas/studies';
import { decimalsFor, fixed, NBSP, NOTHING, parseNumber, PLUS_MINUS, signed } from './numbers';

export const metresPerUnit: Record<LengthUnit, number> = { m: 1, cm: 0.01, mm: 0.001, in: 0.0254 };
export const lengthUnitNames: Record<LengthUnit, string> = {
	m: 'metres (m)',
	cm: 'centimetres (cm)',
	mm: 'millimetres (mm)',
	in: 'inches (in)'
};

/** Metres as millimetres: `4.00 mm`; with `unit`, in that unit. */
export function length(metres: number | null | undefined, unit: LengthUnit = 'mm', digits?: number): string {
	if (metres == null || !Number.isFinite(metres)) return NOTHING;
	const value = metres / metresPerUnit[unit];
	return `${fixed(value, digits ?? Math.min(4, decimalsFor(value, 3)))}${NBSP}${unit}`;
}

/** Cubic metres as litres (`431.20 L`), as cubic centimetres below a tenth of a litre, as they are from 10 m^3. */
export function volume(cubicMetres: number | null | undefined): string {
	if (cubicMetres == null || !Number.isFinite(cubicMetres)) return NOTHING;
	const size = Math.abs(cubicMetres);
	if (size >= 10) return `${fixed(cubicMetres, 4)}${NBSP}m³`;
	if (size >= 1e-4) return `${fixed(cubicMetres * 1e3, 2)}${NBSP}L`;
	return `${fixed(cubicMetres * 1e6, 2)}${NBSP}cm³`;
}

/** Square metres: `3.1416 m²`, as square centimetres below a hundredth. */
export function area(squareMetres: number | null | undefined): string {
	if (squareMetres == null || !Number.isFinite(squareMetres)) return NOTHING;
	return squareMetres >= 0.01
		? `${fixed(squareMetres, Math.min(4, decimalsFor(squareMetres, 5)))}${NBSP}m²`
		: `${fixed(squareMetres * 1e4, 2)}${NBSP}cm²`;
}

/** A unit as it stands behind a value: nothing for coefficients (`1` or empty). */
export function unitSuffix(unit: string): string {
	return unit === '' || unit === '1' ? '' : `${NBSP}${unit}`;
}

/**
 * The decimals for values of one objective: two figures of the uncertainty where there is one (`44.80 ± 0.35`), otherwise
 * `figures` of the value.
 */
export function objectiveDecimals(value: number, uncertainty?: number | null, figures = 4): number {
	return uncertainty ? decimalsFor(uncertainty, 2) : decimalsFor(value, figures);
}

/** `44.80 ± 0.35 N` */
export function objectiveValue(
	value: number | null | undefined,
	unit: string,
	uncertainty?: number | null,
	digits?: number
): string {
	if (value == null || !Number.isFinite(value)) return NOTHING;
	const d = digits ?? objectiveDecimals(value, uncertainty);
	const band = uncertainty ? `${NBSP}${PLUS_MINUS}${NBSP}${fixed(uncertainty, d)}` : '';
	return `${fixed(value, d)}${band}${unitSuffix(unit)}`;
}

/** `−1.42 N`; with an uncertainty, `−1.42 ± 0.50 N` */
export function objectiveChange(
	change: number | null | undefined,
	unit: string,
	uncertainty?: number | null,
	digits?: number
): string {
	if (change == null || !Number.isFinite(change)) return NOTHING;
	const d = digits ?? objectiveDecimals(change, uncertainty, 3);
	const band = uncertainty ? `${NBSP}${PLUS_MINUS}${NBSP}${fixed(uncertainty, d)}` : '';
	return `${signed(change, d)}${band}${unitSuffix(unit)}`;
}

/** Whether a change goes the way the objective wants: 1 better, -1 worse, 0 neither (`hold`, or no change). */
export function direction(change: number, sense: Objective['sense']): -1 | 0 | 1 {
	if (sense === 'hold' || change === 0) return 0;
	return change < 0 === (sense === 'minimise') ? 1 : -1;
}

/** Units that a typed length may carry, in metres. */
const typedUnits: Record<string, number> = { ...metresPerUnit, µm: 1e-6, um: 1e-6, '"': 0.0254, ft: 0.3048 };

/**
 * A typed length (`4`, `4.0 mm`, `0.16 in`) in metres; a bare number is in `unit`. NaN when it cannot be read.
 */
export function parseLength(text: string, unit: LengthUnit): number {
	const [, number, suffix] = /^(.*?)\s*([a-zµ"]*)\s*$/i.exec(text) ?? [];
	if (number === undefined) return NaN;
	const factor = suffix === '' ? metresPerUnit[unit] : typedUnits[suffix.toLowerCase()];
	// 700 mm is 0.7 m, not the product's 0.7000000000000001: a file's recipe should show what was typed.
	return factor === undefined ? NaN : Number((parseNumber(number) * factor).toPrecision(15));
}
