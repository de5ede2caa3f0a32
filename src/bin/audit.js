// `npm run audit`: every screen through axe, in every role, state and theme, and the main ones through Lighthouse. Fails
// where accessibility or best practices are below 100. Performance is printed and never asserted: machines are noisy.
// `--only=axe,lighthouse` runs one of the two.
import { join } from 'node:path';
import { parseArgs } from 'node:util';
import { build, ensureInstalled, isBuilt, nodeProblem, ROOT } from './prepare.js';

const { values } = parseArgs({ options: { only: { type: 'string', default: '' } } });

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

// TypeScript over the app's own modules; vite runs it as it is. Imported only now, when it is there.
const { runnerImport } = await import('vite');
/** @type {{ module: typeof import('../../tests/audit/main') }} */
const { module } = await runnerImport(join(ROOT, 'tests/audit/main.ts'), {
	configFile: false,
	root: ROOT,
	logLevel: 'error',
	resolve: { alias: { $lib: join(ROOT, 'src/lib') } }
});
process.exit((await module.audit(values.only === '' ? [] : values.only.split(','))) ? 0 : 1);
