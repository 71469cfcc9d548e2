/**
 * The shortest decimal text that reads back to the same float32, also through a float64 in between.
 * Tries 6 to 9 significant digits: 9 always suffice for float32 (IEEE 754-2019, 5.12.2), up to the double rounding that
 * the check itself excludes.
 */
export function float32Text(value: number): string {
	if (Object.is(value, -0)) return '-0';
	if (Number.isInteger(value) && Math.abs(value) < 1e7) return String(value);
	for (let digits = 1; digits <= 9; digits++) {
		// Most coordinates of real meshes need 7 to 9 digits, so the short ones are tried only when the number is short.
		if (digits === 1 && Math.fround(Number(value.toPrecision(6))) !== value) digits = 7;
		const number = Number(value.toPrecision(digits));
		if (Math.fround(number) === value) return String(number);
	}
	return String(value);
}
