import { lineAt, shown, syntax, truncated } from './errors';
import { latin, nameText } from './text';

/** An element of the small part of XML that data files use. Text stays where it is: numbers are read from the bytes. */
export interface XmlNode {
	name: string;
	attributes: Record<string, string>;
	children: XmlNode[];
	/** Byte of the element's `<`. */
	byte: number;
	/** Bytes between the start tag and the first child or the end tag. */
	textFrom: number;
	textTo: number;
}

const MAX_DEPTH = 64;
const MAX_NODES = 200_000;
const LESS = 60;
const MORE = 62;

const ENTITIES: Record<string, string> = { lt: '<', gt: '>', amp: '&', quot: '"', apos: "'" };

function unescape(text: string): string {
	return text.replace(/&(#x[0-9a-f]{1,6}|#\d{1,7}|\w{1,8});/gi, (whole, entity: string) => {
		if (entity[0] !== '#') return ENTITIES[entity] ?? whole;
		const code = entity[1] === 'x' || entity[1] === 'X' ? parseInt(entity.slice(2), 16) : parseInt(entity.slice(1), 10);
		return code <= 0x10ffff ? String.fromCodePoint(code) : whole;
	});
}

function find(bytes: Uint8Array, from: number, text: string): number {
	outer: for (let i = from; i <= bytes.length - text.length; i++) {
		if (bytes[i] !== text.charCodeAt(0)) continue;
		for (let k = 1; k < text.length; k++) if (bytes[i + k] !== text.charCodeAt(k)) continue outer;
		return i;
	}
	return -1;
}

/**
 * Reads the elements up to `stopAt`, whose content may be no XML (raw appended data).
 * @param bytes the whole file, borrowed
 * @returns the root, and the element that stopped the reading
 * @throws MorphError file-syntax, file-truncated
 */
export function readXml(bytes: Uint8Array, stopAt: string): { root: XmlNode; stopped: XmlNode | null } {
	let at = 0;
	let root: XmlNode | null = null;
	let nodes = 0;
	const open: XmlNode[] = [];
	const place = (byte: number) => ({ byte, line: lineAt(bytes, byte) });
	const cutOff = () =>
		truncated(`The file ends inside ${open.length > 0 ? `<${shown(open[open.length - 1].name)}>` : 'its first tag'}.`, {
			byte: bytes.length
		});
	for (;;) {
		while (at < bytes.length && bytes[at] !== LESS) at++;
		if (at >= bytes.length) throw cutOff();
		const from = at;
		const head = latin(bytes, from, Math.min(bytes.length, from + 9));
		if (head.startsWith('<!--') || head.startsWith('<?') || head.startsWith('<!')) {
			const ending = head.startsWith('<!--') ? '-->' : head.startsWith('<?') ? '?>' : '>';
			if (head === '<![CDATA[') throw syntax(`Line ${lineAt(bytes, from)}: CDATA is not read here.`, place(from));
			const end = find(bytes, from + 2, ending);
			if (end < 0) throw cutOff();
			at = end + ending.length;
			continue;
		}
		// An attribute may hold ">", so quotes are followed.
		let quote = 0;
		let end = from + 1;
		for (; end < bytes.length; end++) {
			const byte = bytes[end];
			if (quote) {
				if (byte === quote) quote = 0;
			} else if (byte === 34 || byte === 39) quote = byte;
			else if (byte === MORE) break;
			else if (byte === LESS) break;
		}
		if (end >= bytes.length) throw cutOff();
		const tag = nameText(bytes.subarray(from + 1, end));
		if (bytes[end] !== MORE || end - from > 1 << 20) {
			throw syntax(`Line ${lineAt(bytes, from)}: the tag "<${shown(tag)}" is not closed.`, place(from));
		}
		at = end + 1;
		if (tag[0] === '/') {
			const node = open.pop();
			const name = tag.slice(1).trim();
			if (!node || node.name !== name) {
				throw syntax(
					`Line ${lineAt(bytes, from)}: </${shown(name)}> closes ${node ? `<${shown(node.name)}>` : 'nothing'}.`,
					place(from)
				);
			}
			if (node.children.length === 0) node.textTo = from;
			if (open.length === 0) return { root: node, stopped: null };
			continue;
		}
		const match = /^([A-Za-z_][\w.:-]*)((?:\s+[\w.:-]+\s*=\s*(?:"[^"]*"|'[^']*'))*)\s*(\/?)$/s.exec(tag);
		if (!match) throw syntax(`Line ${lineAt(bytes, from)}: "<${shown(tag)}>" is no tag.`, place(from));
		const attributes: Record<string, string> = Object.create(null);
		for (const [, key, value] of match[2].matchAll(/([\w.:-]+)\s*=\s*("[^"]*"|'[^']*')/g)) {
			attributes[key] = unescape(value.slice(1, -1));
		}
		const node: XmlNode = { name: match[1], attributes, children: [], byte: from, textFrom: at, textTo: at };
		const parent = open[open.length - 1];
		if (parent) {
			if (parent.children.length === 0) parent.textTo = from;
			parent.children.push(node);
		} else root = node;
		if (++nodes > MAX_NODES) throw syntax(`The file has more than ${MAX_NODES} elements.`, place(from));
		if (match[3] === '/') {
			if (open.length === 0) return { root: node, stopped: null };
			continue;
		}
		if (node.name === stopAt && root) return { root, stopped: node };
		open.push(node);
		if (open.length > MAX_DEPTH)
			throw syntax(`Line ${lineAt(bytes, from)}: the elements are nested too deep.`, place(from));
	}
}
