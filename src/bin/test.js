// `npm test`: everything that must hold, from a fresh clone. Goes on after a failure, so that one
// run shows all of them. The last line is "N passed, N failed".
import { existsSync, mkdtempSync, readFileSync, rmSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { build, ensureInstalled, nodeProblem, npm, run } from './prepare.js';

/** @typedef {import('./prepare.js').Outcome} Outcome */
/** @typedef {{ passed: number, failed: number }} Count */

const reports = mkdtempSync(join(tmpdir(), 'tallybar-test-'));
const total = { passed: 0, failed: 0 };

/**
 * Runs one step and prints one line about it; on failure also what it printed.
 *
 * @param {string} name
 * @param {() => Promise<Outcome>} work
 * @param {() => Count} [count] For a step made of tests: how many passed and failed.
 * @returns {Promise<boolean>} whether it passed
 */
async function step(name, work, count) {
	const started = Date.now();
	const { code, output } = await work();
	const seconds = `${((Date.now() - started) / 1000).toFixed(1)} s`.padStart(8);
	const { passed, failed } = judge(code, count);
	total.passed += passed;
	total.failed += failed;
	const detail = count === undefined ? '' : ` (${passed} passed, ${failed} failed)`;
	console.log(`${failed === 0 ? 'ok    ' : 'FAILED'} ${seconds}  ${name}${detail}`);
	if (failed > 0) console.log(output.trimEnd());
	return failed === 0;
}

/**
 * @param {number} code
 * @param {(() => Count) | undefined} count
 * @returns {Count}
 */
function judge(code, count) {
	if (count === undefined) return code === 0 ? { passed: 1, failed: 0 } : { passed: 0, failed: 1 };
	try {
		const { passed, failed } = count();
		// A runner that failed for a reason of its own, or that ran nothing, has not passed.
		const broken = failed === 0 && (code !== 0 || passed === 0);
		return { passed, failed: broken ? 1 : failed };
	} catch {
		return { passed: 0, failed: 1 };
	}
}

/** @param {string} name */
const report = (name) => join(reports, `${name}.json`);

/** @param {string} name */
function vitestCount(name) {
	/** @type {{ numPassedTests: number, numFailedTests: number, testResults: { status: string, assertionResults: unknown[] }[] }} */
	const { numPassedTests, numFailedTests, testResults } = JSON.parse(
		readFileSync(report(name), 'utf8')
	);
	// A file that could not be loaded has no tests to fail.
	const unloaded = testResults.filter(
		(file) => file.status === 'failed' && file.assertionResults.length === 0
	);
	return { passed: numPassedTests, failed: numFailedTests + unloaded.length };
}

/** @param {string} name */
function playwrightCount(name) {
	/** @type {{ stats: { expected: number, unexpected: number, flaky: number }, errors: unknown[] }} */
	const { stats, errors } = JSON.parse(readFileSync(report(name), 'utf8'));
	return { passed: stats.expected, failed: stats.unexpected + stats.flaky + errors.length };
}

/**
 * A browser to drive: CHROMIUM_PATH, Debian's Chromium, or Playwright's own download.
 *
 * @returns {Promise<Outcome>}
 */
async function ensureChromium() {
	const chosen = process.env['CHROMIUM_PATH'];
	if (chosen) {
		return existsSync(chosen)
			? { code: 0, output: '' }
			: { code: 1, output: `CHROMIUM_PATH: there is no ${chosen}` };
	}
	if (existsSync('/usr/bin/chromium')) return { code: 0, output: '' };
	if (process.getuid?.() === 0 && existsSync('/usr/bin/apt-get')) {
		const env = { DEBIAN_FRONTEND: 'noninteractive' };
		const update = await run('apt-get', ['update', '-qq'], { env });
		const install = await run(
			'apt-get',
			['install', '-y', '-qq', '--no-install-recommends', 'chromium'],
			{ env }
		);
		return { code: install.code, output: update.output + install.output };
	}
	return npm(['exec', '--no', '--', 'playwright', 'install', 'chromium']);
}

async function main() {
	const problem = nodeProblem();
	if (
		!(await step('Node', () => Promise.resolve({ code: problem ? 1 : 0, output: problem ?? '' })))
	) {
		return;
	}
	if (!(await step('packages', ensureInstalled))) return;
	const browser = await step('browser', ensureChromium);
	const script = (/** @type {string} */ name, /** @type {string[]} */ ...args) =>
		npm(['run', '--silent', name, ...(args.length > 0 ? ['--', ...args] : [])]);
	await step('format', () => script('format:check'));
	// First of those that read types: it also makes the generated ones.
	await step('types', () => script('check'));
	await step('lint', () => script('lint'));
	await step('dependency rule', () => script('deps'));
	await step('unused code', () => script('knip'));
	for (const name of ['unit', 'property']) {
		await step(
			`${name} tests`,
			() =>
				script(name, '--reporter=default', '--reporter=json', `--outputFile.json=${report(name)}`),
			() => vitestCount(name)
		);
	}
	if (!(await step('build', build)) || !browser) return;
	await step(
		'end-to-end tests',
		() =>
			run(
				process.execPath,
				['node_modules/@playwright/test/cli.js', 'test', '--reporter=list,json'],
				{
					env: { PLAYWRIGHT_JSON_OUTPUT_NAME: report('e2e') }
				}
			),
		() => playwrightCount('e2e')
	);
}

await main();
rmSync(reports, { recursive: true, force: true });
console.log(`${total.passed} passed, ${total.failed} failed`);
process.exitCode = total.failed === 0 ? 0 : 1;
