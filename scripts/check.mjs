// npm run check: format, lint, types and layers.
import { runChecks } from './lib/checks.mjs';
import { ensurePackages } from './lib/install.mjs';
import { endChildren, stopRequested } from './lib/processes.mjs';
import { main, say } from './lib/say.mjs';

await main(async () => {
	void stopRequested().then(endChildren);
	await ensurePackages();
	const { passed, failed } = await runChecks();
	say(`${passed} passed, ${failed} failed`);
	return failed > 0 ? 1 : 0;
});
