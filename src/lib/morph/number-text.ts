/** Powers of ten that float64 holds exactly (Clinger 1990): a short decimal times one of them is rounded once. */
const EXACT_POWERS = Float64Array.from({ length: 23 }, (_, i) => Number(`1e${i}`));
const MAX_EXACT_DIGITS = 15;

/**
 * The decimal number in bytes[start, end), or NaN when the bytes are no number (also for "nan" and "inf"). Correctly
 * rounded: short numbers without making a string, the others by the language's own parser.
 */
export function parseNumber(bytes: Uint8Array, start: number, end: number): number {
	let i = start;
	let negative = false;
	if (bytes[i] === 45) {
		negative = true;
		i++;
	} else if (bytes[i] === 43) i++;
	let mantissa = 0;
	let digits = 0;
	let any = false;
	let exponent = 0;
	for (; i < end; i++) {
		const d = bytes[i] - 48;
		if (d < 0 || d > 9) break;
		any = true;
		if (digits > 0 || d > 0) digits++;
		mantissa = mantissa * 10 + d;
	}
	if (i < end && bytes[i] === 46) {
		for (i++; i < end; i++) {
			const d = bytes[i] - 48;
			if (d < 0 || d > 9) break;
			any = true;
			if (digits > 0 || d > 0) digits++;
			mantissa = mantissa * 10 + d;
			exponent--;
		}
	}
	if (!any) return NaN;
	if (i < end && (bytes[i] | 32) === 101) {
		i++;
		let minus = false;
		if (bytes[i] === 45) {
			minus = true;
			i++;
		} else if (bytes[i] === 43) i++;
		if (i >= end) return NaN;
		let e = 0;
		for (; i < end; i++) {
			const d = bytes[i] - 48;
			if (d < 0 || d > 9) return NaN;
			if (e < 100000) e = e * 10 + d;
		}
		exponent += minus ? -e : e;
	}
	if (i !== end) return NaN;
	if (digits > MAX_EXACT_DIGITS || exponent > 22 || exponent < -22) {
		return Number(String.fromCharCode(...bytes.subarray(start, end)));
	}
	const value = exponent < 0 ? mantissa / EXACT_POWERS[-exponent] : mantissa * EXACT_POWERS[exponent];
	return negative ? -value : value;
}
