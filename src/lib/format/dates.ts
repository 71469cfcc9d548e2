/** Dates as text. UTC, and marked so, where the reader's zone is not known: server and browser then write the same. */

const months = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec'];
const two = (n: number) => String(n).padStart(2, '0');

/** `3 Mar 2026` */
export function day(iso: string | null | undefined): string {
	if (!iso) return '–';
	const d = new Date(iso);
	return `${d.getUTCDate()} ${months[d.getUTCMonth()]} ${d.getUTCFullYear()}`;
}

/** `3 Mar 2026, 14:05 UTC` */
export function moment(iso: string | null | undefined): string {
	if (!iso) return '–';
	const d = new Date(iso);
	return `${day(iso)}, ${two(d.getUTCHours())}:${two(d.getUTCMinutes())} UTC`;
}
