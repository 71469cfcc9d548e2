// npm run token -- --email E [--study ID]: prints a new API token as its last line.
import { runInTerminal } from './lib/command.mjs';
import { main } from './lib/say.mjs';

await main(() => runInTerminal('token', process.argv.slice(2)));
