// Plain Node with nothing but its own modules: it runs before anything is installed.
import { spawn } from 'node:child_process';
import { createHash } from 'node:crypto';
import { existsSync, readdirSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { fileURLToPath } from 'node:url';

/** The repository's folder. */
export const ROOT = fileURLToPath(new URL('../..', import.meta.url));

/** What the build is made of; a change in any of it makes the build stale. */
const BUILT_FROM = [
	'src',
	'static',
	'migrations',
	'package-lock.json',
	'svelte.config.js',
	'tsconfig.json',
	'vite.config.ts'
];

const STAMP = 'build/.built-from';

/**
 * @typedef {object} Outcome
 * @property {number} code Exit code; 1 when a signal ended the command or it could not be started.
 * @property {string} output What it printed, unless it printed to the terminal.
 */

/**
 * Runs a command in the repository and waits for its end.
 *
 * @param {string} command
 * @param {readonly string[]} args
 * @param {{ show?: boolean, env?: NodeJS.ProcessEnv }} [options] `show`: print to stderr as it comes.
 * @returns {Promise<Outcome>}
 */
export function run(command, args, { show = false, env = {} } = {}) {
	return new Promise((resolve) => {
		const child = spawn(command, args, {
			cwd: ROOT,
			env: { ...process.env, ...env },
			stdio: ['ignore', show ? process.stderr : 'pipe', show ? process.stderr : 'pipe']
		});
		let output = '';
		const collect = (/** @type {Buffer} */ chunk) => {
			output += chunk.toString();
		};
		child.stdout?.on('data', collect);
		child.stderr?.on('data', collect);
		child.on('error', (error) => {
			resolve({ code: 1, output: output + error.message });
		});
		child.on('close', (code) => {
			resolve({ code: code ?? 1, output });
		});
	});
}

/**
 * Runs npm: the one that runs this script, else the one on the path.
 *
 * @param {readonly string[]} args
 * @param {{ show?: boolean, env?: NodeJS.ProcessEnv }} [options]
 * @returns {Promise<Outcome>}
 */
export function npm(args, options) {
	const self = process.env['npm_execpath'];
	return self === undefined
		? run('npm', args, options)
		: run(process.execPath, [self, ...args], options);
}

/** Says in one line what is wrong with this Node, or nothing. */
export function nodeProblem() {
	const [major = 0, minor = 0] = process.versions.node.split('.').map(Number);
	if (major === 20 && minor >= 19) return undefined;
	return `Tallybar needs Node 20 (20.19 or later); this is ${process.version}.`;
}

/** Whether every package of the lock file is installed in the version the lock file names. */
export function isInstalled() {
	try {
		const wanted = lockedPackages('package-lock.json');
		const present = lockedPackages('node_modules/.package-lock.json');
		for (const [path, entry] of Object.entries(wanted)) {
			if (path === '') continue;
			const found = present[path];
			// A package for another system is in the lock and rightly not here.
			if (found === undefined ? entry.optional !== true : found.version !== entry.version) {
				return false;
			}
		}
		return true;
	} catch {
		return false;
	}
}

/**
 * @param {string} file
 * @returns {Record<string, { version?: string, optional?: boolean }>}
 */
function lockedPackages(file) {
	/** @type {{ packages: Record<string, { version?: string, optional?: boolean }> }} */
	const lock = JSON.parse(readFileSync(join(ROOT, file), 'utf8'));
	return lock.packages;
}

/**
 * Installs from the lock file what is missing.
 *
 * @returns {Promise<Outcome>}
 */
export async function ensureInstalled() {
	if (isInstalled()) return { code: 0, output: '' };
	// Also under NODE_ENV=production: the build needs the development packages.
	return npm(['ci', '--include=dev'], { env: headersBesideNode() });
}

/**
 * better-sqlite3 is compiled where no finished build of it can be had, and for that node-gyp would fetch Node's headers.
 * Where they lie beside this very Node, they are taken from there: it works without a network, with any home directory.
 *
 * @returns {Record<string, string>}
 */
function headersBesideNode() {
	const prefix = dirname(dirname(process.execPath));
	const there = existsSync(join(prefix, 'include', 'node', 'node_version.h'));
	return there ? { npm_config_nodedir: prefix } : {};
}

/** A digest over names and contents of everything the build is made of. */
function sourceDigest() {
	const hash = createHash('sha256');
	for (const path of BUILT_FROM.flatMap(filesBelow)) {
		hash
			.update(`${path}\0`)
			.update(readFileSync(join(ROOT, path)))
			.update('\0');
	}
	return hash.digest('hex');
}

/**
 * @param {string} path
 * @returns {string[]}
 */
function filesBelow(path) {
	const full = join(ROOT, path);
	if (!existsSync(full)) return [];
	if (/\.\w+$/.test(path)) return [path];
	return readdirSync(full, { recursive: true, withFileTypes: true })
		.filter((entry) => entry.isFile() && !entry.name.endsWith('.test.ts'))
		.map((entry) => join(entry.parentPath, entry.name).slice(ROOT.length))
		.filter((file) => !file.startsWith(join('src', 'bin')))
		.sort();
}

/** Whether build/ was made from the sources as they are now. */
export function isBuilt() {
	const stamp = join(ROOT, STAMP);
	return existsSync(stamp) && readFileSync(stamp, 'utf8') === sourceDigest();
}

/**
 * Builds. The stamp is taken before and written after, so that a build which failed, or whose
 * sources changed meanwhile, is made again.
 *
 * @param {{ show?: boolean }} [options]
 * @returns {Promise<Outcome>}
 */
export async function build(options) {
	const digest = sourceDigest();
	rmSync(join(ROOT, STAMP), { force: true });
	const vite = join(ROOT, 'node_modules/vite/bin/vite.js');
	const outcome = await run(process.execPath, [vite, 'build'], options);
	if (outcome.code === 0) writeFileSync(join(ROOT, STAMP), digest);
	return outcome;
}
