/** The server's log: one JSON line an event, to standard output. LOG_LEVEL chooses how much; tests are silent. */
import { pino } from 'pino';

export const log = pino({
	level: process.env.LOG_LEVEL || (process.env.VITEST ? 'silent' : 'info'),
	base: null,
	redact: ['password', '*.password', 'headers.authorization', 'headers.cookie']
});
