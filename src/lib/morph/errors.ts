/** Every reason for which the engine refuses its input. A closed set: callers map it to HTTP or to words. */
export type MorphErrorCode =
	| 'stl-empty'
	| 'stl-truncated'
	| 'stl-not-stl'
	| 'stl-syntax'
	| 'stl-non-finite'
	| 'file-empty'
	| 'file-unknown'
	| 'file-truncated'
	| 'file-syntax'
	| 'file-non-finite'
	| 'file-unsupported'
	| 'file-too-large'
	| 'csv-empty'
	| 'csv-syntax'
	| 'csv-non-finite'
	| 'map-shape'
	| 'map-unmatched'
	| 'mesh-shape'
	| 'mesh-non-finite'
	| 'mesh-open'
	| 'box-invalid'
	| 'box-empty'
	| 'no-free-points'
	| 'metric-singular'
	| 'gradient-zero'
	| 'gradient-missing'
	| 'step-invalid'
	| 'smoothing-invalid'
	| 'constraint-invalid'
	| 'constraint-conflict'
	| 'step-unreachable'
	| 'symmetry-invalid'
	| 'hand-invalid'
	| 'keep-out-invalid'
	| 'keep-out-open'
	| 'thickness-invalid'
	| 'lock-invalid'
	| 'part-invalid'
	| 'rehearsal-invalid'
	| 'unsupported';

/** Where in the input the fault sits. Counts start at 1 for lines and rows (as an editor shows them), at 0 for the rest. */
export interface MorphPlace {
	/** Line of a text file, from 1. */
	line?: number;
	/** Byte offset in the file, from 0. */
	byte?: number;
	/** Triangle index, from 0. */
	triangle?: number;
	/** Vertex index, from 0. */
	vertex?: number;
	/** Data row of a table, from 1. */
	row?: number;
	/** Name or id of the design box. */
	box?: string;
	/** Id of the objective. */
	objective?: string;
	/** Index of the constraint in the request, from 0. */
	constraint?: number;
}

/** Refusal of bad input: what is wrong (`message`), where (`place`), and what mends it (`mend`). */
export class MorphError extends Error {
	readonly code: MorphErrorCode;
	readonly place?: MorphPlace;
	readonly mend: string;

	constructor(code: MorphErrorCode, message: string, mend: string, place?: MorphPlace) {
		super(message);
		this.name = 'MorphError';
		this.code = code;
		this.mend = mend;
		this.place = place;
	}
}
