export type ScalarType =
	'int8' | 'uint8' | 'int16' | 'uint16' | 'int32' | 'uint32' | 'int64' | 'uint64' | 'float32' | 'float64';

export type NumberArray =
	Int8Array | Uint8Array | Int16Array | Uint16Array | Int32Array | Uint32Array | Float32Array | Float64Array;

export const SCALAR_BYTES: Record<ScalarType, number> = {
	int8: 1,
	uint8: 1,
	int16: 2,
	uint16: 2,
	int32: 4,
	uint32: 4,
	int64: 8,
	uint64: 8,
	float32: 4,
	float64: 8
};

const ARRAYS = {
	int8: Int8Array,
	uint8: Uint8Array,
	int16: Int16Array,
	uint16: Uint16Array,
	int32: Int32Array,
	uint32: Uint32Array,
	float32: Float32Array,
	float64: Float64Array
};

const hostIsLittle = new Uint8Array(new Uint16Array([1]).buffer)[0] === 1;
const TWO_32 = 4294967296;

export const isFloat = (type: ScalarType) => type === 'float32' || type === 'float64';

function swap(bytes: Uint8Array, size: number): void {
	for (let i = 0; i < bytes.length; i += size) {
		for (let a = i, b = i + size - 1; a < b; a++, b--) {
			const byte = bytes[a];
			bytes[a] = bytes[b];
			bytes[b] = byte;
		}
	}
}

/**
 * Numbers from bytes, as a copy. 64-bit integers become float64 (exact up to 2^53).
 * @param bytes borrowed; at least from + count * size long
 */
export function decodeScalars(
	bytes: Uint8Array,
	from: number,
	count: number,
	type: ScalarType,
	little: boolean
): NumberArray {
	const size = SCALAR_BYTES[type];
	const copy = bytes.slice(from, from + count * size);
	if (size > 1 && little !== hostIsLittle) swap(copy, size);
	if (type === 'int64' || type === 'uint64') {
		const words = new Uint32Array(copy.buffer, 0, 2 * count);
		const low = hostIsLittle ? 0 : 1;
		const out = new Float64Array(count);
		for (let i = 0; i < count; i++) {
			const high = words[2 * i + 1 - low];
			out[i] = (type === 'int64' ? high | 0 : high) * TWO_32 + words[2 * i + low];
		}
		return out;
	}
	return new ARRAYS[type](copy.buffer, 0, count);
}

/** One number at a byte offset. */
export function readScalar(view: DataView, at: number, type: ScalarType, little: boolean): number {
	switch (type) {
		case 'float32':
			return view.getFloat32(at, little);
		case 'int32':
			return view.getInt32(at, little);
		case 'uint8':
			return view.getUint8(at);
		case 'uint32':
			return view.getUint32(at, little);
		case 'float64':
			return view.getFloat64(at, little);
		case 'int8':
			return view.getInt8(at);
		case 'int16':
			return view.getInt16(at, little);
		case 'uint16':
			return view.getUint16(at, little);
		case 'int64':
			return view.getInt32(little ? at + 4 : at, little) * TWO_32 + view.getUint32(little ? at : at + 4, little);
		case 'uint64':
			return view.getUint32(little ? at + 4 : at, little) * TWO_32 + view.getUint32(little ? at : at + 4, little);
	}
}
