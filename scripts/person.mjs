// npm run person -- --email E ...: makes a person or changes one, where nobody can yet sign in to do it.
import { runInTerminal } from './lib/command.mjs';
import { main } from './lib/say.mjs';

await main(() => runInTerminal('person', process.argv.slice(2)));
