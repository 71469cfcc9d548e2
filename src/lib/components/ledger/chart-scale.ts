/** Round steps of 1, 2 or 5 times a power of ten, so that about `wanted` of them span `low..high`. */
export function ticksOver(low: number, high: number, wanted: number): { values: number[]; digits: number } {
	const span = high - low || Math.abs(high) || 1;
	const rough = span / wanted;
	const power = 10 ** Math.floor(Math.log10(rough));
	const step = ([1, 2, 5, 10].find((m) => m * power >= rough * 0.999) ?? 10) * power;
	const first = Math.ceil(low / step - 1e-9);
	const last = Math.floor(high / step + 1e-9);
	const values = Array.from({ length: last - first + 1 }, (_, i) => (first + i) * step);
	return { values, digits: Math.max(0, -Math.floor(Math.log10(step) + 1e-9)) };
}
