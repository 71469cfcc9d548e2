import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { checkHealth } from '$lib/server/services/health';

export const GET = handle(operations.health, () => checkHealth());
