/** A worker thread of the server: a shell over runTask. It opens its own small pool of database connections when first needed. */
import { MeshCache } from '$lib/server/services/mesh-cache';
import { PREVIEW_CACHE_BYTES, runTask } from '$lib/server/jobs/run-task';
import type { ThreadOutcome, ThreadTask } from '$lib/server/jobs/protocol';

const cache = new MeshCache(PREVIEW_CACHE_BYTES);

export default (task: ThreadTask): Promise<ThreadOutcome> => runTask(task, cache);
