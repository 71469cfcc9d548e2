/** How numbers are written: U+2212 for the minus, no more digits than the number carries, `–` for nothing. */

export const MINUS = '\u2212';
export const PLUS_MINUS = '\u00b1';
export const NOTHING = '–';
/** Holds number and unit together at a line's end. */
export const NBSP = '\u00a0';

/** `x` with `digits` decimals. A value that rounds to zero is written without a sign. */
export function fixed(x: number, digits: number): string {
	if (!Number.isFinite(x)) return NOTHING;
	const text = Math.abs(x).toFixed(digits);
	return x < 0 && Number(text) !== 0 ? MINUS + text : text;
}

/** As `fixed`, with a plus before positive values: for changes. */
export function signed(x: number, digits: number): string {
	if (!Number.isFinite(x)) return NOTHING;
	const text = fixed(x, digits);
	return x > 0 && Number(text) !== 0 ? `+${text}` : text;
}

/** The decimals that show `x` with `figures` significant figures, never negative and never more than 9. */
export function decimalsFor(x: number, figures: number): number {
	if (!Number.isFinite(x) || x === 0) return Math.max(0, figures - 1);
	const exponent = Math.floor(Math.log10(Math.abs(Number(x.toPrecision(figures)))));
	return Math.min(9, Math.max(0, figures - 1 - exponent));
}

/** `x` with `figures` significant figures; very large and very small values as a power of ten. */
export function sensible(x: number, figures = 4): string {
	if (!Number.isFinite(x)) return NOTHING;
	if (x !== 0 && (Math.abs(x) >= 1e7 || Math.abs(x) < 1e-6)) {
		const [mantissa, exponent] = x.toExponential(figures - 1).split('e');
		return `${mantissa.replace('-', MINUS)}e${exponent.replace('+', '').replace('-', MINUS)}`;
	}
	return fixed(x, decimalsFor(x, figures));
}

/** As `sensible`, with a plus before positive values. */
export function signedSensible(x: number, figures = 3): string {
	const text = sensible(x, figures);
	return x > 0 ? `+${text}` : text;
}

/** A value that a person entered, as they entered it: up to nine figures, no tail of zeros. */
export function plain(x: number): string {
	return Number.isFinite(x) ? String(Number(x.toPrecision(9))).replace('-', MINUS) : NOTHING;
}

/** 40,212 */
export function count(n: number): string {
	return Math.round(n)
		.toString()
		.replace(/\B(?=(\d{3})+(?!\d))/g, ',');
}

/** `one` or `many` behind the number: `1 shape`, `4 shapes`. */
export function plural(n: number, one: string, many = `${one}s`): string {
	return `${count(n)}${NBSP}${n === 1 ? one : many}`;
}

/** A share in per cent: 0.0982 -> `9.8 %`. */
export function percent(x: number, digits = 1): string {
	return `${fixed(100 * x, digits)}${NBSP}%`;
}

/** A change in per cent: -0.0982 -> `−9.8 %`. */
export function signedPercent(x: number, digits = 1): string {
	return `${signed(100 * x, digits)}${NBSP}%`;
}

/** Reads what people type: `4.0`, `4,0`, `−4`, `1e-3`. NaN when it is no number. */
export function parseNumber(text: string): number {
	const plain = text
		.trim()
		.replace(/[\u2212\u2013]/g, '-')
		.replace(/[\s\u00a0\u202f]/g, '');
	const point = plain.includes('.') ? plain.replace(/,/g, '') : plain.replace(',', '.');
	return /^[+-]?(\d+\.?\d*|\.\d+)(e[+-]?\d+)?$/i.test(point) ? Number(point) : NaN;
}
