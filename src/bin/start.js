// `npm start`: from a fresh clone to a page that works. What it says goes to stderr, so that stdout
// holds the server's log and nothing else.
import { spawn } from 'node:child_process';
import { existsSync } from 'node:fs';
import { join } from 'node:path';
import { build, ensureInstalled, isBuilt, isInstalled, nodeProblem, ROOT } from './prepare.js';

const say = (/** @type {string} */ text) => process.stderr.write(`${text}\n`);

/**
 * @param {string} what
 * @param {() => Promise<import('./prepare.js').Outcome>} work
 */
async function step(what, work) {
	say(what);
	const { code, output } = await work();
	if (code === 0) return;
	say(output);
	say('That did not work; the reason stands above. Nothing was started.');
	process.exit(1);
}

const problem = nodeProblem();
if (problem !== undefined) {
	say(problem);
	process.exit(1);
}
if (!isInstalled()) {
	await step('Installing what Tallybar needs (a minute or two, only this once) …', ensureInstalled);
}
if (!isBuilt()) await step('Building Tallybar (some seconds, only after a change) …', build);

const envFile = join(ROOT, '.env');
if (existsSync(envFile)) process.loadEnvFile(envFile);

const server = spawn(process.execPath, [join(ROOT, 'src/bin/server.js')], {
	cwd: ROOT,
	stdio: ['ignore', 'inherit', 'inherit', 'ipc']
});
server.on('message', (message) => {
	const { origin } = /** @type {{ origin: string }} */ (message);
	say(`\nTallybar is running. Open ${origin} in a browser.\nTo stop it, press Ctrl+C here.\n`);
});
for (const signal of /** @type {const} */ (['SIGTERM', 'SIGINT', 'SIGHUP'])) {
	process.on(signal, () => server.kill(signal));
}
// Stopped by a signal, npm takes its shell down with it and tells nobody below: then this process has
// a new parent, and the server would run on unseen.
if (process.env['npm_lifecycle_event'] !== undefined) {
	const parent = process.ppid;
	setInterval(() => {
		if (process.ppid !== parent) server.kill('SIGTERM');
	}, 200).unref();
}
server.on('exit', (code, signal) => {
	process.exitCode = code ?? (signal === null ? 0 : 1);
});
