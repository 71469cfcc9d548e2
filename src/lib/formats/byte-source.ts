/** Bytes of a data array, whichever way they stand in the file. */
export interface ByteSource {
	/** The next n bytes, or fewer at the end. The result is borrowed or fresh, and not to be changed. */
	read(n: number): Uint8Array;
	/** Most bytes that can still come. */
	readonly left: number;
}

export class RawSource implements ByteSource {
	constructor(
		private readonly bytes: Uint8Array,
		private at: number
	) {}

	read(n: number): Uint8Array {
		const from = this.at;
		this.at = Math.min(this.bytes.length, from + n);
		return this.bytes.subarray(from, this.at);
	}

	get left(): number {
		return Math.max(0, this.bytes.length - this.at);
	}
}

const VALUE = new Int8Array(256).fill(-1);
for (let i = 0; i < 64; i++) {
	VALUE['ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz0123456789+/'.charCodeAt(i)] = i;
}
const PAD = 61;

/**
 * Base64 (RFC 4648) by groups of four characters. A padded group may be followed by others: VTK files encode the header of
 * a compressed array, and some programs the byte count, as a run of its own before the data.
 */
export class Base64Source implements ByteSource {
	private pending: number[] = [];
	/** Byte of the first character that is none of base64, or -1. */
	fault = -1;

	constructor(
		private readonly bytes: Uint8Array,
		private at: number,
		private readonly end: number
	) {}

	read(n: number): Uint8Array {
		const out = new Uint8Array(Math.min(n, this.pending.length + this.left));
		let filled = 0;
		while (filled < n && this.pending.length > 0) out[filled++] = this.pending.shift()!;
		const { bytes, end } = this;
		let i = this.at;
		while (filled < n) {
			let word = 0;
			let digits = 0;
			let pads = 0;
			// Line breaks may fall anywhere.
			while (digits + pads < 4 && i < end) {
				const byte = bytes[i];
				const value = VALUE[byte];
				if (value >= 0 && pads === 0) {
					word = (word << 6) | value;
					digits++;
				} else if (byte === PAD) pads++;
				else if (byte > 32) {
					this.fault = i;
					this.at = end;
					return out.subarray(0, filled);
				}
				i++;
			}
			if (digits + pads < 4) break;
			word <<= 6 * pads;
			const count = digits - 1;
			for (let k = 0; k < count; k++) {
				const byte = (word >> (16 - 8 * k)) & 255;
				if (filled < n) out[filled++] = byte;
				else this.pending.push(byte);
			}
		}
		this.at = i;
		return out.subarray(0, filled);
	}

	get left(): number {
		return this.pending.length + Math.ceil((Math.max(0, this.end - this.at) * 3) / 4);
	}
}
