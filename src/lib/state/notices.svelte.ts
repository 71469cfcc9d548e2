import { getContext, setContext } from 'svelte';
import { asProblem } from '$lib/api/client';

export interface Notice {
	id: number;
	tone: 'done' | 'refused';
	text: string;
	mend?: string;
	/** Takes the action back, where that can be done. */
	undo?: () => void | Promise<void>;
}

const KEY = Symbol('notices');
const SHOWN_MS = 7000;

/** Short messages at the page's edge: what was done (with the way back), what was refused (until it is closed). */
export class Notices {
	list = $state<Notice[]>([]);
	#next = 1;

	done(text: string, undo?: Notice['undo']) {
		const id = this.#add({ tone: 'done', text, undo });
		setTimeout(() => this.close(id), SHOWN_MS);
	}

	refused(cause: unknown) {
		const problem = asProblem(cause);
		this.#add({ tone: 'refused', text: problem.message, mend: problem.mend });
	}

	close(id: number) {
		this.list = this.list.filter((notice) => notice.id !== id);
	}

	#add(notice: Omit<Notice, 'id'>) {
		const id = this.#next++;
		this.list.push({ id, ...notice });
		return id;
	}
}

export function setNotices(): Notices {
	return setContext(KEY, new Notices());
}

export function getNotices(): Notices {
	return getContext<Notices>(KEY);
}
