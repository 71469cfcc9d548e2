/** Wire types that every subject uses. SI throughout: metres, cubic metres, square metres, seconds. */
import { z } from 'zod';
import { finite } from './primitives';

export const id = z.uuid();
export const vec3 = z.tuple([finite, finite, finite]);

/** A plane by a point and its unit normal, metres. */
export const plane = z.object({
	point: vec3.describe('m'),
	normal: vec3.refine((n) => Math.abs(Math.hypot(...n) - 1) < 1e-6, 'must have length 1')
});
export type Plane = z.infer<typeof plane>;

export const timestamp = z.iso.datetime();

export const lengthUnit = z.enum(['m', 'mm', 'cm', 'in']);
export type LengthUnit = z.infer<typeof lengthUnit>;

export const role = z
	.enum(['viewer', 'reviewer', 'engineer'])
	.describe('Role in a study; each includes the ones before it.');
export type Role = z.infer<typeof role>;

/** Who did something, as shown beside it. */
export const person = z.object({ id, name: z.string() });
export type Person = z.infer<typeof person>;

export const bounds = z.object({ min: vec3, max: vec3 });

/** RFC 9457, with our stable `code`, the `mend`, and field errors by JSON pointer. */
export const problem = z.object({
	type: z.string(),
	title: z.string(),
	status: z.int(),
	detail: z.string(),
	code: z.string(),
	mend: z.string().optional().describe('what to do about it'),
	errors: z.array(z.object({ pointer: z.string(), detail: z.string() })).optional()
});
export type Problem = z.infer<typeof problem>;

export const health = z.object({ status: z.literal('ok') });
