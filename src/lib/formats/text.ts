/** 10^k for k = 0..MAX_POWER as unevaluated sums hi + lo of two float64 (the sum is exact to about 2^-106). */
const MAX_POWER = 60;
const POWER_HI = new Float64Array(MAX_POWER + 1);
const POWER_LO = new Float64Array(MAX_POWER + 1);
for (let k = 0; k <= MAX_POWER; k++) {
	const exact = 10n ** BigInt(k);
	POWER_HI[k] = Number(exact);
	POWER_LO[k] = Number(exact - BigInt(POWER_HI[k]));
}
/** Digits that a float64 integer holds exactly, whatever they are. */
const EXACT_DIGITS = 15;
/** Dekker 1971: splits a float64 into two halves of 26 bits. */
const SPLIT = 134217729;
/** Where the low part comes this near to half a unit of the high part, rounding is left to the language's parser. */
const NEAR_TIE = 2 ** -90;

function productError(a: number, b: number, p: number): number {
	const ca = SPLIT * a;
	const ah = ca - (ca - a);
	const al = a - ah;
	const cb = SPLIT * b;
	const bh = cb - (cb - b);
	const bl = b - bh;
	return ah * bh - p + ah * bl + al * bh + al * bl;
}

/**
 * (head * 10^tailDigits + tail) * 10^exponent rounded to float64, or NaN where the last bit is not certain. Double-double
 * arithmetic after Dekker 1971; head and tail are integers of at most 15 digits.
 */
function scaled(head: number, tail: number, tailDigits: number, exponent: number): number {
	if (exponent > MAX_POWER || exponent < -MAX_POWER) return NaN;
	const scale = POWER_HI[tailDigits];
	let hi = head * scale;
	let lo = productError(head, scale, hi) + tail;
	let sum = hi + lo;
	lo = lo - (sum - hi);
	hi = sum;
	if (exponent > 0) {
		const p = hi * POWER_HI[exponent];
		const e = productError(hi, POWER_HI[exponent], p) + (hi * POWER_LO[exponent] + lo * POWER_HI[exponent]);
		hi = p + e;
		lo = e - (hi - p);
	} else if (exponent < 0) {
		const d = POWER_HI[-exponent];
		const q = hi / d;
		const p = q * d;
		// The remainder is exact, so that the correction carries the full second word.
		const r = hi - p - productError(q, d, p) + lo - q * POWER_LO[-exponent];
		const c = r / d;
		sum = q + c;
		lo = c - (sum - q);
		hi = sum;
	}
	// hi is the nearest float64 unless lo lies next to half a unit in the last place of hi.
	const up = hi + lo * (1 + NEAR_TIE * 2 ** 53);
	const down = hi + lo * (1 - NEAR_TIE * 2 ** 53);
	return up === hi && down === hi ? hi : NaN;
}

/** The same bytes as a plain Uint8Array: Node's Buffer has a slice that shares its memory. */
export const plainBytes = (bytes: Uint8Array): Uint8Array =>
	bytes.constructor === Uint8Array ? bytes : new Uint8Array(bytes.buffer, bytes.byteOffset, bytes.byteLength);

const MINUS = 45;
const PLUS = 43;
const POINT = 46;

/** Reads tokens and numbers from a text without making strings. Byte offsets only: see lineAt for lines. */
export class TextReader {
	at: number;
	/** Bounds of the token that `token` found last. */
	start = 0;
	/** Significant digits of the longest number read so far. */
	mostDigits = 0;

	/**
	 * @param bytes borrowed
	 * @param end where the text ends, by default with the bytes
	 */
	constructor(
		readonly bytes: Uint8Array,
		at = 0,
		readonly end = bytes.length
	) {
		this.at = at;
	}

	/** Skips blanks within a line; control characters count as such, as they do for the end of a token. */
	skipBlanks(): void {
		const { bytes, end } = this;
		let i = this.at;
		while (i < end && bytes[i] <= 32 && bytes[i] !== 10 && bytes[i] !== 13) i++;
		this.at = i;
	}

	/** Skips blanks and line ends. */
	skipWhite(): void {
		const { bytes, end } = this;
		let i = this.at;
		while (i < end && bytes[i] <= 32) i++;
		this.at = i;
	}

	/** Moves to the next token in any line; false at the end. The token is bytes[start, at). */
	token(): boolean {
		this.skipWhite();
		const { bytes, end } = this;
		let i = this.at;
		this.start = i;
		while (i < end && bytes[i] > 32) i++;
		this.at = i;
		return i > this.start;
	}

	/** Whether the last token is this lower-case word, in any case. */
	is(word: string): boolean {
		if (this.at - this.start !== word.length) return false;
		for (let k = 0; k < word.length; k++) {
			const byte = this.bytes[this.start + k];
			const lower = byte >= 65 && byte <= 90 ? byte + 32 : byte;
			if (lower !== word.charCodeAt(k)) return false;
		}
		return true;
	}

	text(): string {
		return latin(this.bytes, this.start, this.at);
	}

	atLineEnd(): boolean {
		return this.at >= this.end || this.bytes[this.at] === 10 || this.bytes[this.at] === 13;
	}

	/** Bytes up to the line's end, which is consumed. */
	restOfLine(): Uint8Array {
		const from = this.at;
		this.skipLine();
		let to = this.at;
		if (to > from && this.bytes[to - 1] === 10) to--;
		if (to > from && this.bytes[to - 1] === 13) to--;
		return this.bytes.subarray(from, to);
	}

	/** Moves behind the line's end. */
	skipLine(): void {
		const { bytes, end } = this;
		let i = this.at;
		while (i < end && bytes[i] !== 10 && bytes[i] !== 13) i++;
		if (i < end) i += bytes[i] === 13 && bytes[i + 1] === 10 ? 2 : 1;
		this.at = i;
	}

	/**
	 * The next token of any line as a number, correctly rounded. NaN when it is none (then it is text()), or spells nan.
	 * Beyond the usual spellings: a D for the exponent, and none before its sign after a point (1.5-103), as Fortran
	 * programs write them.
	 */
	number(): number {
		this.skipWhite();
		return this.numberHere();
	}

	/** Like number, at the current byte. */
	numberHere(): number {
		const { bytes, end } = this;
		let i = this.at;
		const start = i;
		this.start = i;
		let negative = false;
		let byte = i < end ? bytes[i] : 0;
		if (byte === MINUS || byte === PLUS) {
			negative = byte === MINUS;
			i++;
		}
		let head = 0;
		let tail = 0;
		let digits = 0;
		let exponent = 0;
		let any = false;
		let point = false;
		for (; i < end; i++) {
			byte = bytes[i];
			const d = byte - 48;
			if (d >= 0 && d <= 9) {
				any = true;
				if (point) exponent--;
				if (digits === 0 && d === 0) continue;
				digits++;
				if (digits <= EXACT_DIGITS) head = head * 10 + d;
				else if (digits <= 2 * EXACT_DIGITS) tail = tail * 10 + d;
			} else if (byte === POINT && !point) point = true;
			else break;
		}
		if (any && i < end && bytes[i] > 32) {
			byte = bytes[i];
			const letter = byte === 101 || byte === 69 || byte === 100 || byte === 68;
			if (letter || (point && (byte === PLUS || byte === MINUS))) {
				let k = letter ? i + 1 : i;
				let minus = false;
				if (k < end && (bytes[k] === PLUS || bytes[k] === MINUS)) {
					minus = bytes[k] === MINUS;
					k++;
					// 3.1+e2: the sign before the letter.
					if (!letter && k < end && (bytes[k] | 32) === 101) k++;
				}
				const first = k;
				let e = 0;
				for (; k < end; k++) {
					const d = bytes[k] - 48;
					if (d < 0 || d > 9) break;
					if (e < 100000) e = e * 10 + d;
				}
				if (k > first) {
					exponent += minus ? -e : e;
					i = k;
				}
			}
		}
		this.at = i;
		if (!any) return this.word();
		if (digits > this.mostDigits) this.mostDigits = digits;
		let value: number;
		if (digits <= EXACT_DIGITS && exponent >= -22 && exponent <= 22) {
			// Both factors are exact, so that the one operation rounds correctly (Clinger 1990).
			value = exponent < 0 ? head / POWER_HI[-exponent] : head * POWER_HI[exponent];
		} else if (digits === 0) value = 0;
		else {
			value =
				digits > 2 * EXACT_DIGITS
					? NaN
					: scaled(head, tail, digits > EXACT_DIGITS ? digits - EXACT_DIGITS : 0, exponent);
			if (Number.isNaN(value)) value = byLanguage(latin(bytes, start, i));
			else if (negative) value = -value;
			return value;
		}
		return negative ? -value : value;
	}

	/** The token of a spelled-out value: takes it whole; infinities as such, all else NaN. */
	private word(): number {
		const { bytes, end } = this;
		let i = this.start;
		while (i < end && bytes[i] > 32) i++;
		this.at = i;
		const text = this.text().toLowerCase();
		if (/^\+?inf(inity)?$/.test(text)) return Infinity;
		if (/^-inf(inity)?$/.test(text)) return -Infinity;
		return NaN;
	}

	/** Whether the current byte ends a token. */
	atTokenEnd(): boolean {
		return this.at >= this.end || this.bytes[this.at] <= 32;
	}

	/** A decimal integer at the current byte (not skipping blanks); NaN when there is none. */
	integerHere(): number {
		const { bytes, end } = this;
		let i = this.at;
		this.start = i;
		let negative = false;
		if (i < end && (bytes[i] === MINUS || bytes[i] === PLUS)) {
			negative = bytes[i] === MINUS;
			i++;
		}
		const first = i;
		let value = 0;
		for (; i < end; i++) {
			const d = bytes[i] - 48;
			if (d < 0 || d > 9) break;
			value = value * 10 + d;
		}
		this.at = i;
		if (i === first) return NaN;
		return negative ? -value : value;
	}
}

/** Numbers beyond the table or the certain digits, after bringing them to the usual spelling. */
function byLanguage(text: string): number {
	const usual = text
		.toLowerCase()
		.replace('d', 'e')
		.replace(/([+-])e(?=\d)/, 'e$1')
		.replace(/([\d.])([+-])/, '$1e$2');
	return Number(usual);
}

/** Whether a token spells a value that is not finite (nan, inf, also as C libraries of Windows write them). */
export const spellsNonFinite = (text: string) => /^[+-]?(nan|inf|1\.#)/i.test(text);

/** Bytes as text, one character a byte. */
export function latin(bytes: Uint8Array, from: number, to: number): string {
	let out = '';
	for (let i = from; i < to; i += 4096) out += String.fromCharCode(...bytes.subarray(i, Math.min(to, i + 4096)));
	return out;
}

const utf8 = new TextDecoder('utf-8', { fatal: true });
const latin1 = new TextDecoder('latin1');

/** A name in the file's encoding: UTF-8, or Latin-1 when it is none. */
export function nameText(bytes: Uint8Array): string {
	try {
		return utf8.decode(bytes).trim();
	} catch {
		return latin1.decode(bytes).trim();
	}
}
