// npm run build: the server, the worker threads' bundle and the commands, all under build/.
import { build } from './lib/build.mjs';
import { ensurePackages } from './lib/install.mjs';
import { endChildren, stopRequested } from './lib/processes.mjs';
import { main, say } from './lib/say.mjs';

await main(async () => {
	void stopRequested().then(endChildren);
	await ensurePackages();
	await build();
	say('Built: build/index.js (server), build/workers, build/cli');
});
