/** What a cold visit of the bench loads, and what the service worker keeps: bytes after gzip. */
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { ROOT } from '../../src/bin/prepare.js';
import type { Row } from './report';

const ROUTE = '/(shop)/builds/[build]/bench/[seam]';
const OUTPUT = join(ROOT, '.svelte-kit/output');
/** What comes behind the page without anybody asking: everything that talks to the server, and the watch for updates. */
const BY_ITSELF = /(^src\/lib\/device\/network\.ts|virtual:pwa-register)$/;
/** What only comes when it is asked for. */
const SHEET = /^src\/lib\/components\/bench\/\w+Sheet\.svelte$/;

/** Of SvelteKit's manifest, what says which nodes make a page. */
interface Pages {
	readonly _: {
		readonly nodes: readonly (() => Promise<{ readonly index: number }>)[];
		readonly routes: readonly {
			readonly id: string;
			readonly page: {
				readonly layouts: readonly (number | undefined)[];
				readonly errors: readonly (number | undefined)[];
				readonly leaf: number;
			} | null;
		}[];
	};
}

/** Vite's manifest. SvelteKit's own lists leave out what a page shares with one it imports in time. */
type Built = Readonly<
	Record<
		string,
		{
			readonly file: string;
			readonly name?: string;
			readonly isEntry?: boolean;
			readonly imports?: readonly string[];
			readonly dynamicImports?: readonly string[];
			readonly css?: readonly string[];
		}
	>
>;

/** Imports a module that the build made, by its path. */
export type ImportBuilt = (file: string) => Promise<unknown>;

/** @param loaded what a browser was seen to load, as a check: what comes at once and what comes by itself */
export async function bytes(loaded: readonly string[], importBuilt: ImportBuilt): Promise<Row[]> {
	const { atOnce, byItself, sheets } = await filesOfRoute(importBuilt);
	const all = new Set([...atOnce, ...byItself, ...sheets]);
	const seen = `A browser on its first visit loaded ${loaded.length} files, ${sum(loaded.map((path) => path.slice(1))).toFixed(1)} kB.`;
	const row = (what: string, files: ReadonlySet<string>): Row => {
		const kB = sum([...files]);
		const one = { n: 1, p50: kB, p95: kB };
		return { name: `${what}, gzip (${files.size} files)`, unit: 'kB', tallybar: one };
	};
	const first = row('bench route, imported at once', atOnce);
	return [
		{
			...first,
			goal: { text: '≤ 90 kB', met: first.tallybar.p50 <= 90 },
			note: `Scripts and styles without which it shows no seam and writes no line. ${loaded.length === 0 ? '' : seen}`
		},
		row('bench route, loaded behind it', byItself),
		row('bench route, its sheets when asked for', sheets),
		row('bench route, all of these', all),
		row('precache', precache())
	];
}

async function filesOfRoute(importBuilt: ImportBuilt) {
	const { manifest } = (await importBuilt(join(OUTPUT, 'server/manifest-full.js'))) as {
		manifest: Pages;
	};
	const { nodes, routes } = manifest._;
	const page = routes.find(({ id }) => id === ROUTE)?.page;
	if (!page) throw new Error(`the build has no ${ROUTE}`);
	const parts = await Promise.all(
		[...page.layouts, ...page.errors, page.leaf].flatMap((index) => {
			const node = index === undefined ? undefined : nodes[index];
			return node ? [node()] : [];
		})
	);
	const built = JSON.parse(
		readFileSync(join(OUTPUT, 'client/.vite/manifest.json'), 'utf8')
	) as Built;
	const names = ['entry/start', 'entry/app', ...parts.map(({ index }) => `nodes/${index}`)];
	const roots = Object.keys(built).filter(
		(key) => built[key]?.isEntry && names.includes(built[key].name ?? '')
	);
	const atOnce = imported(built, roots);
	const inTime = [...atOnce].flatMap((key) => built[key]?.dynamicImports ?? []);
	const later = (which: RegExp) =>
		imported(
			built,
			inTime.filter((key) => which.test(key)),
			atOnce
		);
	return {
		atOnce: files(built, atOnce),
		byItself: files(built, later(BY_ITSELF)),
		sheets: files(built, later(SHEET))
	};
}

/** These and all that they import, directly or not; beyond what is `there` also what they import in time. */
function imported(built: Built, keys: readonly string[], there?: ReadonlySet<string>): Set<string> {
	const found = new Set(keys);
	for (const key of found) {
		const { imports = [], dynamicImports = [] } = built[key] ?? {};
		for (const next of there ? [...imports, ...dynamicImports] : imports)
			if (there?.has(next) !== true) found.add(next);
	}
	return found;
}

function files(built: Built, keys: ReadonlySet<string>): Set<string> {
	const found = new Set<string>();
	for (const key of keys)
		for (const file of [built[key]?.file, ...(built[key]?.css ?? [])])
			if (file !== undefined) found.add(file);
	return found;
}

/** The list that was written into the service worker. */
function precache(): Set<string> {
	const worker = readFileSync(join(ROOT, 'build/client/service-worker.js'), 'utf8');
	const found = [...worker.matchAll(/"?\burl"?:\s*"([^"]+)"/g)].map(([, url = '']) => url);
	if (found.length === 0) throw new Error('no precache was found in the service worker');
	return new Set(found);
}

function sum(files: readonly string[]): number {
	return files.reduce((total, file) => total + zipped(file), 0) / 1000;
}

function zipped(file: string): number {
	for (const folder of ['client', 'prerendered']) {
		for (const name of [file, `${file === '' || file === '/' ? 'index' : file}.html`]) {
			try {
				return gzipSync(readFileSync(join(ROOT, 'build', folder, name)), { level: 9 }).length;
			} catch {
				// Elsewhere.
			}
		}
	}
	throw new Error(`the build has no ${file}`);
}
