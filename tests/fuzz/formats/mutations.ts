/** A small seeded generator (mulberry32, public domain) and what it does to bytes. */
export function generator(seed: number): () => number {
	let a = seed >>> 0;
	return () => {
		a = (a + 0x6d2b79f5) >>> 0;
		let t = a;
		t = Math.imul(t ^ (t >>> 15), t | 1);
		t ^= t + Math.imul(t ^ (t >>> 7), t | 61);
		return ((t ^ (t >>> 14)) >>> 0) / 4294967296;
	};
}

/** Texts that parsers trip over: numbers at limits, keywords of all the formats, ends of lines. */
const WORDS = [
	'-1',
	'0',
	'4294967295',
	'4294967296',
	'99999999999999999999',
	'1e999',
	'-1e999',
	'nan',
	'inf',
	'1.#QNAN',
	'0x10',
	'1e',
	'--1',
	'',
	' ',
	'\n',
	'\r',
	'\r\n',
	'\0',
	'"',
	"'",
	'<',
	'>',
	'&',
	'/',
	'\\\n',
	'#',
	',',
	';',
	'\t',
	'é',
	'\uFEFF',
	'solid',
	'endsolid',
	'facet',
	'vertex',
	'f',
	'v',
	'g',
	'element face 1000000000',
	'property list uchar int vertex_indices',
	'end_header',
	'POINTS 1000000000 float',
	'POLYGONS 2000000000 9',
	'CELL_DATA',
	'FIELD f 1',
	'METADATA',
	'LOOKUP_TABLE default',
	'<Piece NumberOfPoints="1000000000">',
	'<DataArray',
	'</DataArray>',
	'format="appended" offset="9999999"',
	'NumberOfComponents="0"',
	'header_type="UInt64"',
	'compressor="vtkZLibDataCompressor"',
	'====',
	'<!--',
	'<![CDATA['
];
const BYTES = [0, 1, 127, 128, 254, 255, 10, 13, 32, 45, 46, 48, 57];

/** One to four changes: bytes flipped, set, cut out, doubled, moved; words put in; the end cut off; 32-bit words set. */
export function mutate(seed: Uint8Array, others: Uint8Array[], random: () => number): Uint8Array {
	const below = (n: number) => Math.floor(random() * n);
	let bytes = seed;
	for (let changes = 1 + below(4); changes > 0; changes--) {
		const at = below(bytes.length + 1);
		const span = random() < 0.7 ? below(8) : below(bytes.length + 1);
		const end = Math.min(bytes.length, at + span);
		const splice = (insert: Uint8Array, to = end) => {
			const out = new Uint8Array(at + insert.length + bytes.length - to);
			out.set(bytes.subarray(0, at));
			out.set(insert, at);
			out.set(bytes.subarray(to), at + insert.length);
			return out;
		};
		const none = new Uint8Array(0);
		switch (below(9)) {
			case 0:
			case 1: {
				bytes = bytes.slice();
				if (at < bytes.length) bytes[at] ^= 1 << below(8);
				break;
			}
			case 2: {
				bytes = bytes.slice();
				bytes.fill(BYTES[below(BYTES.length)], at, end);
				break;
			}
			case 3:
				bytes = splice(none);
				break;
			case 4:
				bytes = splice(bytes.slice(at, end), at);
				break;
			case 5:
				bytes = splice(new TextEncoder().encode(WORDS[below(WORDS.length)]), random() < 0.5 ? at : end);
				break;
			case 6:
				bytes = bytes.slice(0, at);
				break;
			case 7: {
				bytes = bytes.slice();
				if (at + 4 <= bytes.length) {
					const word = [0, 1, 0x7fffffff, 0x80000000, 0xffffffff, 0x7f800000, below(65536)][below(7)];
					new DataView(bytes.buffer).setUint32(at, word, random() < 0.5);
				}
				break;
			}
			default: {
				const other = others[below(others.length)];
				const from = below(other.length + 1);
				bytes = splice(other.slice(from, from + span));
			}
		}
	}
	return bytes;
}
