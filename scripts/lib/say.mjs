// Progress goes to standard error and results to standard output, so that the last line of `npm run token` is the token.

/** A failure whose message is a sentence for the person at the terminal: printed without a stack. */
export class Trouble extends Error {
	/**
	 * @param {string} message what is wrong, and the command or setting that mends it
	 * @param {number} [exitCode]
	 */
	constructor(message, exitCode = 1) {
		super(message);
		this.exitCode = exitCode;
	}
}

/** @param {string} text */
export function note(text) {
	process.stderr.write(`${text}\n`);
}

/** @param {string} text */
export function say(text) {
	process.stdout.write(`${text}\n`);
}

/**
 * The last lines of a long output, indented to stand under a sentence.
 * @param {string} text
 * @param {number} [count]
 */
export function lastLines(text, count = 20) {
	const lines = text.trimEnd().split('\n');
	return lines
		.slice(-count)
		.map((line) => `    ${line}`)
		.join('\n');
}

/**
 * Runs a command's body and turns its outcome into the exit code.
 * @param {() => Promise<number | void>} body returns the exit code, 0 when it returns nothing
 */
export async function main(body) {
	try {
		process.exitCode = (await body()) ?? 0;
	} catch (error) {
		if (error instanceof Trouble) {
			note(`\n${error.message}`);
			process.exitCode = error.exitCode;
		} else {
			note(error instanceof Error ? (error.stack ?? error.message) : String(error));
			process.exitCode = 1;
		}
	}
}
