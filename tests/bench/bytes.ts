/** What a cold visit of the bench loads, and what the service worker keeps: bytes after gzip. */
import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { gzipSync } from 'node:zlib';
import { ROOT } from '../../src/bin/prepare.js';
import type { Row } from './report';

const ROUTE = '/(shop)/builds/[build]/bench/[seam]';
const BUILT = join(ROOT, '.svelte-kit/output/server');

interface Assets {
	readonly imports: readonly string[];
	readonly stylesheets: readonly string[];
}
interface Manifest {
	readonly _: {
		readonly client: Assets;
		readonly nodes: readonly (() => Promise<Assets>)[];
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

/** Imports a module that the build made, by its path. */
export type ImportBuilt = (file: string) => Promise<unknown>;

/** @param loaded what a browser was seen to load, as a check of the manifest; it also loads some when idle */
export async function bytes(loaded: readonly string[], importBuilt: ImportBuilt): Promise<Row[]> {
	const files = await filesOfRoute(importBuilt);
	const route = files.reduce((sum, file) => sum + zipped(file), 0) / 1000;
	const seen = loaded.reduce((sum, path) => sum + zipped(path.slice(1)), 0) / 1000;
	const precached = precache();
	const all = precached.reduce((sum, file) => sum + zipped(file), 0) / 1000;
	const one = (value: number) => ({ n: 1, p50: value, p95: value });
	return [
		{
			name: `bench route, gzip (${files.length} files)`,
			unit: 'kB',
			tallybar: one(route),
			goal: { text: '≤ 90 kB', met: route <= 90 },
			note: `Scripts and styles by the manifest of the build. ${loaded.length === 0 ? '' : `A browser on its first visit loaded ${loaded.length} files, ${seen.toFixed(1)} kB.`}`
		},
		{ name: `precache, gzip (${precached.length} files)`, unit: 'kB', tallybar: one(all) }
	];
}

async function filesOfRoute(importBuilt: ImportBuilt): Promise<string[]> {
	const { manifest } = (await importBuilt(join(BUILT, 'manifest-full.js'))) as {
		manifest: Manifest;
	};
	const { client, nodes, routes } = manifest._;
	const page = routes.find(({ id }) => id === ROUTE)?.page;
	if (!page) throw new Error(`the build has no ${ROUTE}`);
	const wanted = [...page.layouts, ...page.errors, page.leaf];
	const parts = await Promise.all(
		wanted.flatMap((index) => {
			const node = index === undefined ? undefined : nodes[index];
			return node ? [node()] : [];
		})
	);
	return [
		...new Set(
			[client, ...parts].flatMap(({ imports, stylesheets }) => [...imports, ...stylesheets])
		)
	];
}

/** The list that was written into the service worker. */
function precache(): string[] {
	const worker = readFileSync(join(ROOT, 'build/client/service-worker.js'), 'utf8');
	const files = [...worker.matchAll(/"?\burl"?:\s*"([^"]+)"/g)].map(([, url = '']) => url);
	if (files.length === 0) throw new Error('no precache was found in the service worker');
	return [...new Set(files)];
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
