// `npm run bench`: how fast it is, always beside the raw floor in the same run. `--quick` takes less than a minute and
// says little; `--only=tap,carry,push,bytes` runs some parts. Goals are printed beside the figures and never asserted.
import { join } from 'node:path';
import { pathToFileURL } from 'node:url';
import { parseArgs } from 'node:util';
import { build, ensureInstalled, isBuilt, nodeProblem, ROOT } from './prepare.js';

const { values } = parseArgs({
	options: { quick: { type: 'boolean', default: false }, only: { type: 'string', default: '' } }
});

/** @param {string} text @returns {never} */
function fail(text) {
	console.error(text);
	process.exit(1);
}

const problem = nodeProblem();
if (problem !== undefined) fail(problem);
const installed = await ensureInstalled();
if (installed.code !== 0) fail(installed.output);
if (!isBuilt()) {
	const built = await build();
	if (built.code !== 0) fail(built.output);
}

// The bench is TypeScript and takes the app's own modules; vite runs it as it is. Imported only now, when it is there.
const { runnerImport } = await import('vite');
/** @type {{ module: typeof import('../../tests/bench/main') }} */
const { module } = await runnerImport(join(ROOT, 'tests/bench/main.ts'), {
	configFile: false,
	root: ROOT,
	logLevel: 'error',
	resolve: { alias: { $lib: join(ROOT, 'src/lib') } }
});
await module.bench({
	quick: values.quick,
	only: values.only === '' ? [] : values.only.split(','),
	importBuilt: (file) => import(pathToFileURL(file).href)
});
process.exit(0);
