/** A command called wrongly. */
export class Misuse extends Error {
	override readonly name = 'Misuse';
}

interface Refusal extends Error {
	mend?: string;
	errors?: { pointer: string; detail: string }[];
}

/** Writes to stderr why a command failed. @returns the exit code: 2 for a wrong call, 1 for the rest */
export function explain(thrown: unknown, usage: string): number {
	const code = thrown instanceof Error && 'code' in thrown ? String(thrown.code) : '';
	if (thrown instanceof Misuse || code.startsWith('ERR_PARSE_ARGS')) {
		console.error(`${(thrown as Error).message}\nUsage: ${usage}`);
		return 2;
	}
	if (thrown instanceof Error && thrown.name === 'AppError') {
		const { message, mend } = thrown as Refusal;
		console.error(mend ? `${message} ${mend}` : message);
	} else {
		console.error(thrown);
	}
	return 1;
}
