/** Arrays of unknown length; each push is amortised constant time. */
export class GrowingFloats {
	length = 0;
	private data: Float32Array;

	constructor(expected: number) {
		this.data = new Float32Array(Math.max(16, expected));
	}

	push(value: number): void {
		if (this.length === this.data.length) {
			const grown = new Float32Array(2 * this.length);
			grown.set(this.data);
			this.data = grown;
		}
		this.data[this.length++] = value;
	}

	/** A copy of what was pushed. */
	take(): Float32Array {
		return this.data.slice(0, this.length);
	}
}

export class GrowingIndices {
	length = 0;
	data: Uint32Array;

	constructor(expected: number) {
		this.data = new Uint32Array(Math.max(16, expected));
	}

	push(value: number): void {
		if (this.length === this.data.length) {
			const grown = new Uint32Array(2 * this.length);
			grown.set(this.data);
			this.data = grown;
		}
		this.data[this.length++] = value;
	}

	take(): Uint32Array {
		return this.data.slice(0, this.length);
	}
}
