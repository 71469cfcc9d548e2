import type { Objective, OperatingPoint } from '$lib/api/schemas/studies';
import type { LedgerRow } from './ledger';

/** The Ledger's table as CSV (RFC 4180): plain numbers with a decimal point, units in the head, lengths in mm. */
export function ledgerCsv(rows: readonly LedgerRow[], objective: Objective, point: OperatingPoint | null): string {
	const unit = objective.unit && objective.unit !== '1' ? ` [${objective.unit}]` : '';
	const what = objective.name + (point ? `, ${point.name}` : '');
	const head = [
		'shape',
		'name',
		'from',
		'step [mm]',
		'smoothing [mm]',
		`predicted change of ${what}${unit}`,
		`found change of ${what}${unit}`,
		`found change uncertainty${unit}`,
		'ratio found/predicted',
		`${what}${unit}`,
		`uncertainty${unit}`,
		'volume [m^3]',
		'state'
	];
	const lines = rows.map((row) => [
		row.shape.number,
		row.shape.name,
		row.parent?.number,
		millimetres(row.shape.step),
		millimetres(row.shape.smoothing),
		row.predicted,
		row.found,
		row.foundBand,
		row.ratio,
		row.value,
		row.uncertainty,
		row.shape.volume,
		row.shape.state
	]);
	return [head, ...lines].map((cells) => cells.map(cell).join(',')).join('\r\n') + '\r\n';
}

const millimetres = (x: number | null) => (x === null ? null : Number((x * 1000).toPrecision(12)));

function cell(value: string | number | null | undefined): string {
	if (value == null) return '';
	// Twelve figures: all that was stored, none of what subtracting added.
	if (typeof value === 'number') return String(Number(value.toPrecision(12)));
	// A name that a spreadsheet would run as a formula is kept as text.
	const text = /^[=+\-@\t\r]/.test(value) ? `'${value}` : value;
	return /[",\r\n]/.test(text) ? `"${text.replace(/"/g, '""')}"` : text;
}

/** Hands `text` to the browser as a download. */
export function saveText(text: string, filename: string, type = 'text/csv;charset=utf-8') {
	const url = URL.createObjectURL(new Blob([text], { type }));
	const link = document.createElement('a');
	link.href = url;
	link.download = filename;
	link.click();
	setTimeout(() => URL.revokeObjectURL(url), 1000);
}
