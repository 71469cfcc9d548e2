/** What the wire’s schemas are made of; not part of the API’s description under names of their own. */
import { z } from 'zod';

export const finite = z.number();
export const positive = finite.positive();
export const name = z.string().trim().min(1).max(120);
export const note = z.string().trim().max(2000);
