import { describe, expect, it } from 'vitest';
import type { MorphError } from '$lib/morph';
import { planTable } from '$lib/formats/table-plan';
import { readMapTable } from '$lib/formats/table-read';
import { TextReader } from '$lib/formats/text';

const bytes = (text: string) => new TextEncoder().encode(text);
const refusal = (read: () => unknown): MorphError => {
	try {
		read();
	} catch (thrown) {
		return thrown as MorphError;
	}
	throw new Error('It was read.');
};

describe('tables of maps', () => {
	const rows = [
		[0.5, -1.25, 2, 1e-3],
		[1, 2.5, -3, -4.75]
	];
	const points = [0.5, -1.25, 2, 1, 2.5, -3];

	it.each([
		['comma', ',', '.'],
		['semicolon', ';', '.'],
		['semicolon, decimal comma', ';', ','],
		['tab', '\t', '.'],
		['tab, decimal comma', '\t', ','],
		['bar', '|', '.'],
		['blanks', '   ', '.'],
		['blanks, decimal comma', ' ', ','],
		['blank behind the comma', ', ', '.']
	])('%s, with every kind of header', (_, delimiter, decimal) => {
		const body = rows.map((row) => row.map((v) => String(v).replace('.', decimal)).join(delimiter));
		const names = ['X', 'Y', 'Z', 'Sensitivity'];
		const headers: [string, string][] = [
			['', 'none'],
			[`${names.join(delimiter)}\n`, 'line'],
			[`"X [m]"${delimiter}"Y [m]"${delimiter}"Z [m]"${delimiter}"Surface_Sensitivity"\n`, 'line'],
			[`# ${names.join(delimiter)}\n`, 'comment'],
			[`% a title\n// another one\n\n`, 'none']
		];
		for (const [header, kind] of headers) {
			for (const end of ['\n', '\r\n', '\r']) {
				const text = (header + body.join('\n') + '\n').replaceAll('\n', end);
				const { table, plan } = readMapTable(bytes(`\uFEFF${text}`), 'map.txt');
				expect(plan).toMatchObject({ header: kind, decimal, delimiter: delimiter.trim() || delimiter[0] });
				expect([...table.points]).toEqual(points);
				expect([...table.values]).toEqual([1e-3, -4.75]);
				expect(table).toMatchObject({ rows: 2, components: 1 });
			}
		}
	});

	it('columns are found by their names in any order, vectors by their stem', () => {
		const text = 'id,Points:0,Points:1,Points:2,area,dJ_x,dJ_y,dJ_z\na,1,2,3,9,4,5,6\nb,1,2,4,9,7,8,9\n';
		const { table, plan } = readMapTable(bytes(text), 'map.csv');
		expect(plan).toMatchObject({ byName: true, guess: { x: 1, y: 2, z: 3, value: [5, 6, 7] } });
		expect([...table.values]).toEqual([4, 5, 6, 7, 8, 9]);
		expect(plan.columns.map((c) => c.numeric)).toEqual([false, true, true, true, true, true, true, true]);
		expect(plan.rows[1]).toEqual(['b', '1', '2', '4', '9', '7', '8', '9']);
	});

	it('what cannot be told is asked, and the answer taken', () => {
		const text = '1 2 3 4 5\n6 7 8 9 10\n';
		const error = refusal(() => readMapTable(bytes(text), 'map.txt'));
		expect(error.code).toBe('map-shape');
		const { table } = readMapTable(bytes(text), 'map.txt', { columns: { x: 2, y: 1, z: 0, value: [4] } });
		expect([...table.points]).toEqual([3, 2, 1, 8, 7, 6]);
		expect([...table.values]).toEqual([5, 10]);
		// One column may serve twice.
		const twice = readMapTable(bytes(text), 'map.txt', { columns: { x: 0, y: 0, z: 1, value: [1] } }).table;
		expect([...twice.points]).toEqual([1, 1, 2, 6, 6, 7]);
	});

	it('names and units in two lines, quotes with the delimiter inside, an empty last field', () => {
		const text = 'patch;x;y;z;value;\n;m;m;m;N;\n"roof; left";0;0;0;"1,5";\n"a ""b""";1;0;0;2,5;\n';
		const { table, plan } = readMapTable(bytes(text), 'map.csv');
		expect(plan).toMatchObject({ skipLines: 2, decimal: ',', byName: true });
		expect(plan.rows.map((row) => row[0])).toEqual(['roof; left', 'a "b"']);
		expect([...table.values]).toEqual([1.5, 2.5]);
		expect([...table.lines]).toEqual([3, 4]);
	});

	it('UTF-16 with its mark is read', () => {
		const utf16 = Buffer.from('\uFEFFx\ty\tz\tvalue\n1\t2\t3\t4\n', 'utf16le');
		expect([...readMapTable(utf16, 'map.txt').table.values]).toEqual([4]);
	});

	it.each([
		['a letter in a number', 'x,y,z,value\n1,2,3,4\n1,2,3x,4\n', 'csv-syntax', 3, 2],
		['a missing field', 'x,y,z,value\n1,2,3,4\n\n# c\n1,2,3\n', 'csv-syntax', 5, 2],
		['nan', '1 2 3 4\n1 2 3 nan\n', 'csv-non-finite', 2, 2],
		['an infinite number', '1 2 3 4\n1 2 3 1e999\n', 'csv-non-finite', 2, 2],
		['words only', 'this is\nno table\n', 'csv-syntax', 1, 1],
		['nothing', '\n# only a comment\n', 'csv-empty', 1, undefined],
		['zero bytes', '1,2,3,4\n\0', 'csv-syntax', undefined, undefined]
	])('%s is refused at its place', (_, text, code, line, row) => {
		const error = refusal(() => readMapTable(bytes(text), 'map.csv'));
		expect(error.code).toBe(code);
		expect([error.place?.line, error.place?.row]).toEqual([line, row]);
	});

	it('a table beyond the sample is held to the plan made from it', () => {
		const many = Array.from({ length: 5000 }, (_, i) => `${i},0.${i},-1e-${i % 20},${i / 7}`);
		many.push('5000,1,2');
		const error = refusal(() => readMapTable(bytes(many.join('\n')), 'map.csv'));
		expect(error.place).toMatchObject({ line: 5001, row: 5001 });
		expect(planTable(bytes(many.join('\n')), 'map.csv').columns).toHaveLength(4);
	});
});

describe('numbers from text', () => {
	it('are those of the language, to the last bit', () => {
		let state = 7;
		const digit = () => (state = (Math.imul(state, 1103515245) + 12345) >>> 0) >>> 16;
		for (let k = 0; k < 20_000; k++) {
			const length = 1 + (digit() % 25);
			let mantissa = Array.from({ length }, () => String(digit() % 10)).join('');
			const point = digit() % (length + 1);
			if (digit() % 2) mantissa = `${mantissa.slice(0, point)}.${mantissa.slice(point)}`;
			const exponent = digit() % 3 ? `e${(digit() % 80) - 40}` : digit() % 5 ? '' : `E+${digit() % 320}`;
			const text = `${digit() % 2 ? '-' : ''}${mantissa}${exponent}`;
			const reader = new TextReader(bytes(text));
			const value = reader.number();
			if (!Object.is(value, Number(text))) throw new Error(`${text}: ${value} instead of ${Number(text)}`);
			if (reader.at !== text.length) throw new Error(`${text} was not read to its end`);
		}
		expect(state).not.toBe(7);
	});

	it.each([
		['1.5D+03', 1500],
		['-2d-2', -0.02],
		['1.5-103', 1.5e-103],
		['3.1+e2', 310],
		['.5', 0.5],
		['5.', 5],
		['+7', 7],
		['9007199254740993', 9007199254740992],
		['0.1000000000000000055511151231257827', 0.1],
		['Infinity', Infinity],
		['-inf', -Infinity]
	])('%s', (text, value) => {
		expect(new TextReader(bytes(text)).number()).toBe(value);
	});

	it.each(['', '-', '.', 'e5', 'nan', '--1', 'abc'])('%j is none', (text) => {
		expect(new TextReader(bytes(text)).number()).toBeNaN();
	});
});
