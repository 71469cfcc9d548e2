/** JSON schemas of the wire types, each once under its own name, for requests (defaults may be left out) and for answers. */
import { z } from 'zod';

export type JsonSchema = Record<string, unknown>;
type Io = 'input' | 'output';

export interface InlineSchema {
	key: string;
	schema: z.ZodType;
	io: Io;
}

const PREFIX = '#/components/schemas/';
const pascal = (name: string) => name[0].toUpperCase() + name.slice(1);

/** Converts all at once, so that a named schema inside another becomes a reference to it. */
function convert(named: (readonly [string, z.ZodType])[], inline: InlineSchema[], io: Io): Record<string, JsonSchema> {
	const registry = z.registry<{ id?: string }>();
	for (const [name, schema] of named) registry.add(schema, { id: pascal(name) });
	// An operation may take or answer a named schema as it is: that one is referred to, not registered again.
	const own = inline.filter((part) => part.io === io && !registry.has(part.schema));
	for (const { key, schema } of own) registry.add(schema, { id: key });
	const { schemas } = z.toJSONSchema(registry, {
		io,
		target: 'draft-2020-12',
		uri: (id) => PREFIX + id,
		override: ({ jsonSchema }) => {
			if (jsonSchema.type !== 'object' || !jsonSchema.properties) return;
			// What a request brings beyond the schema is refused; what an answer brings one day must not break its reader.
			if (io === 'input') jsonSchema.additionalProperties = false;
			else delete jsonSchema.additionalProperties;
		}
	});
	const result: Record<string, JsonSchema> = {};
	for (const [id, { $schema: _s, $id: _i, ...schema }] of Object.entries(schemas)) result[id] = schema;
	for (const { key, schema } of inline.filter((part) => part.io === io && !own.includes(part))) {
		result[key] = { $ref: PREFIX + registry.get(schema)!.id };
	}
	return result;
}

const refs = (schema: JsonSchema): string[] =>
	[...JSON.stringify(schema).matchAll(/"\$ref":"#\/components\/schemas\/([^"]+)"/g)].map(([, name]) => name);

/** Names that are reached from these, through any number of references. */
function reach(all: Record<string, JsonSchema>, from: string[]): Set<string> {
	const seen = new Set<string>();
	const todo = [...from];
	for (let name = todo.pop(); name !== undefined; name = todo.pop()) {
		if (seen.has(name)) continue;
		seen.add(name);
		todo.push(...refs(all[name]));
	}
	return seen;
}

/** Names whose request form is not their answer form, themselves or through what they refer to. */
function differing(
	input: Record<string, JsonSchema>,
	output: Record<string, JsonSchema>,
	shared: string[]
): Set<string> {
	const strip = (schema: JsonSchema) => JSON.stringify(schema).replaceAll(',"additionalProperties":false', '');
	const found = new Set(shared.filter((name) => strip(input[name]) !== strip(output[name])));
	for (let before = -1; before !== found.size;) {
		before = found.size;
		for (const name of shared) if (refs(input[name]).some((ref) => found.has(ref))) found.add(name);
	}
	return found;
}

/**
 * @param named every schema that has a name
 * @param inline the schemas of the operations, by a key of their own
 * @param always names of answers that no operation mentions
 * @returns the named ones that are reached, and the operations' own with references to them
 */
export function componentsOf(named: (readonly [string, z.ZodType])[], inline: InlineSchema[], always: string[]) {
	const input = convert(named, inline, 'input');
	const output = convert(named, inline, 'output');
	const keys = (io: Io) => inline.filter((part) => part.io === io).map(({ key }) => key);
	const inputKeys = keys('input');
	const outputKeys = keys('output');
	const asked = reach(input, inputKeys);
	const answered = reach(output, [...outputKeys, ...always.map(pascal)]);
	const twofold = differing(
		input,
		output,
		[...asked].filter((name) => answered.has(name))
	);
	const renamed = (schema: JsonSchema): JsonSchema =>
		JSON.parse(
			JSON.stringify(schema).replace(/"\$ref":"#\/components\/schemas\/([^"]+)"/g, (whole, name: string) =>
				twofold.has(name) ? `"$ref":"${PREFIX}${name}Input"` : whole
			)
		);
	const components: Record<string, JsonSchema> = {};
	for (const name of asked)
		if (!inputKeys.includes(name)) components[twofold.has(name) ? `${name}Input` : name] = renamed(input[name]);
	for (const name of answered) if (!outputKeys.includes(name)) components[name] = output[name];
	const sorted = Object.fromEntries(Object.entries(components).sort(([a], [b]) => (a < b ? -1 : 1)));
	return {
		components: sorted,
		inline: Object.fromEntries([
			...inputKeys.map((key) => [key, renamed(input[key])] as const),
			...outputKeys.map((key) => [key, output[key]] as const)
		])
	};
}
