import { GrowingFactor } from './growing-factor';

/** A squared length below this share of a row's own counts as none: the row says what the active ones say already. */
const DEPENDENT = 1e-10;

/** What a guessed row must add to those before it. */
const APART = 1e-6;

export interface ActiveSetProblem {
	/** m x m inner products of the constraints' rows in the inverse metric, unit diagonal; symmetric to the last bit. */
	gram: number[][];
	/** m: value of each constraint at the free optimum, less its bound. */
	slack: number[];
	/** m: whether it is an equality; else slack >= 0 is asked. */
	equality: boolean[];
	/** m: slack below 0 that counts as kept. */
	tolerance: number[];
	/** m: a guess of the active ones, from a problem nearby; any does. */
	guess?: boolean[];
}

export interface ActiveSetSolution {
	/** m multipliers: of the rows in d = d0 + sum multiplier_i H^-1 c_i; >= 0 for inequalities, 0 when not active. */
	multipliers: number[];
	active: boolean[];
	/** Not null when no d keeps all: constraints that contradict each other. */
	conflict: number[] | null;
}

/**
 * The dual method of Goldfarb and Idnani (1983) in terms of inner products alone: from the free optimum, the worst
 * violated constraint is added, and active ones whose multiplier comes to 0 are dropped on the way, until all are kept.
 * Rows that depend on each other do no harm, and a contradiction is found with the constraints that make it.
 */
export function solveActiveSet({ gram, slack, equality, tolerance, guess }: ActiveSetProblem): ActiveSetSolution {
	const m = slack.length;
	const multipliers = new Array<number>(m).fill(0);
	const isActive = new Array<boolean>(m).fill(false);
	let active: number[] = [];
	const now = (i: number) => active.reduce((sum, j) => sum + gram[i][j] * multipliers[j], slack[i]);

	const factor = new GrowingFactor();
	/** Of the active rows, in their order. */
	const bounds = () => active.map((i) => -slack[i]);
	/** What the active rows make up of row p, in the factor's frame, and the squared length of the rest. */
	const project = (p: number) => {
		const y = factor.forward(active.map((i) => gram[i][p]));
		return { y, apart: y.reduce((rest, v) => rest - v * v, gram[p][p]) };
	};
	const activate = (p: number, { y, apart }: ReturnType<typeof project>) => {
		factor.add(y, apart);
		active.push(p);
		isActive[p] = true;
	};
	const drop = (p: number) => {
		factor.drop(active.indexOf(p));
		active = active.filter((j) => j !== p);
		isActive[p] = false;
	};

	const add = (p: number): number[] | null => {
		// An equality is approached from the side on which it lies.
		const sign = now(p) > 0 ? -1 : 1;
		for (;;) {
			const projected = project(p);
			const { apart } = projected;
			const r = factor.back(projected.y.slice());
			let blocking = -1;
			let t1 = Infinity;
			active.forEach((j, k) => {
				if (equality[j] || !(sign * r[k] > 0)) return;
				const t = multipliers[j] / (sign * r[k]);
				if (t < t1) {
					t1 = t;
					blocking = j;
				}
			});
			const gap = now(p) + (isActive[p] ? 0 : gram[p][p] * multipliers[p]);
			const t2 = apart > DEPENDENT * gram[p][p] ? Math.abs(gap) / apart : Infinity;
			const t = Math.min(t1, t2);
			if (t === Infinity) {
				if (Math.abs(gap) <= 10 * tolerance[p]) return null;
				return [p, ...active.filter((_, k) => Math.abs(r[k]) > 1e-6)];
			}
			active.forEach((j, k) => (multipliers[j] -= sign * t * r[k]));
			multipliers[p] += sign * t;
			if (t2 <= t1) {
				activate(p, projected);
				return null;
			}
			multipliers[blocking] = 0;
			drop(blocking);
		}
	};

	/** The optimum for the guessed constraints alone, less those that it does not press on: where the method may begin. */
	const start = (guessed: boolean[]) => {
		for (let i = 0; i < m; i++) {
			if (!guessed[i] || isActive[i]) continue;
			const projected = project(i);
			if (projected.apart > APART * gram[i][i]) activate(i, projected);
		}
		for (;;) {
			const solved = factor.solve(bounds());
			const wrong = active.filter((i, k) => !equality[i] && !(solved[k] > 0));
			if (wrong.length === 0) {
				active.forEach((i, k) => (multipliers[i] = solved[k]));
				return;
			}
			wrong.forEach(drop);
		}
	};

	for (let i = 0; i < m; i++) {
		if (!equality[i]) continue;
		const conflict = add(i);
		if (conflict) return { multipliers, active: isActive, conflict };
	}
	if (guess) start(guess);
	const skipped = new Set<number>();
	for (let round = 0; round < 50 * m + 50; round++) {
		let worst = -1;
		let most = 0;
		for (let i = 0; i < m; i++) {
			if (isActive[i] || equality[i] || skipped.has(i)) continue;
			const value = now(i);
			if (value < -tolerance[i] && value < most) {
				most = value;
				worst = i;
			}
		}
		if (worst < 0) break;
		const conflict = add(worst);
		if (conflict) return { multipliers, active: isActive, conflict };
		if (!isActive[worst]) {
			// It depends on the active ones and is broken by rounding only: those alone, then.
			multipliers[worst] = 0;
			skipped.add(worst);
			const again = factor.solve(bounds());
			active.forEach((i, k) => (multipliers[i] = equality[i] ? again[k] : Math.max(0, again[k])));
		}
	}
	return { multipliers, active: isActive, conflict: null };
}
