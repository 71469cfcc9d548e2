import { operations } from '$lib/api/contract';
import { handle } from '$lib/server/http/handle';
import { openApi } from '$lib/server/http/openapi';

export const GET = handle(operations.openapi, () => openApi());
