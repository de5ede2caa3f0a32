import { sveltekit } from '@sveltejs/kit/vite';
import tailwindcss from '@tailwindcss/vite';
import { SvelteKitPWA } from '@vite-pwa/sveltekit';
import type { Rolldown } from 'vite';
import { defineConfig } from 'vitest/config';

/**
 * What is loaded together is one file: gzip starts anew with each, and forty small ones cost a tenth of what they hold.
 * A chunk is all that its roots import at once, directly or not, and no chunk above it has; the rest is as pages share it.
 *
 * SvelteKit's list of nodes stays out of them all: it imports every page in time, and where it lies SvelteKit counts
 * every page's files as not needed by the others.
 */
const CHUNKS: readonly (readonly [name: string, roots: RegExp])[] = [
	['app', /\/(runtime\/client\/entry|client-optimized\/nodes\/[01])\.js$/],
	['shop', /\/routes\/\(shop\)\/\+layout\.(svelte|ts)$/],
	[
		'build',
		/\/components\/(frame\/Problem\.svelte|logbook\/(WithBuild\.svelte|(fitting|names|opened|people)\.ts))$/
	],
	['bench', /\/components\/bench\/SeamBench\.svelte$/]
];

function chunk([debugName, roots]: (typeof CHUNKS)[number]): Rolldown.CodeSplittingGroup {
	return {
		debugName,
		name: (id, context) => {
			const seen = new Set([id]);
			for (const module of seen) {
				if (roots.test(module)) return debugName;
				for (const importer of context.getModuleInfo(module)?.importers ?? []) seen.add(importer);
			}
			return null;
		}
	};
}

export default defineConfig({
	plugins: [
		tailwindcss(),
		sveltekit(),
		SvelteKitPWA({
			strategies: 'injectManifest',
			srcDir: 'src',
			filename: 'service-worker.ts',
			// 'prompt' for ever: an update that reloads by itself loses what is being typed.
			registerType: 'prompt',
			injectRegister: false,
			manifest: {
				name: 'Tallybar',
				short_name: 'Tallybar',
				description:
					'The rivet log of a home-built aeroplane, kept at the bench without a network.',
				id: '/',
				start_url: '/builds',
				scope: '/',
				display: 'standalone',
				background_color: '#F3F4F0',
				theme_color: '#F3F4F0',
				icons: [
					{ src: '/icon.svg', sizes: 'any', type: 'image/svg+xml' },
					{ src: '/icon-192.png', sizes: '192x192', type: 'image/png' },
					{ src: '/icon-512.png', sizes: '512x512', type: 'image/png' },
					{
						src: '/icon-maskable-512.png',
						sizes: '512x512',
						type: 'image/png',
						purpose: 'maskable'
					}
				]
			},
			injectManifest: {
				globPatterns: [
					'client/**/*.{js,css,ico,png,svg,webp,webmanifest,woff2}',
					'prerendered/**/*.{html,json}'
				]
			},
			// Without version.json in the precache an error after a deploy makes kit reload for ever.
			kit: { includeVersionFile: true }
		})
	],
	define: {
		// Workbox reads it; the service worker has no process.
		'process.env.NODE_ENV': JSON.stringify(process.env.NODE_ENV ?? 'production')
	},
	build: { sourcemap: false },
	environments: {
		client: {
			build: {
				rolldownOptions: {
					// Making a schema does nothing else: those that only the server uses are left out.
					treeshake: { manualPureFunctions: ['z'] },
					output: {
						codeSplitting: { groups: CHUNKS.map(chunk) }
					}
				}
			}
		}
	},
	test: {
		expect: { requireAssertions: true },
		// Of a hanging test, not of a slow machine.
		testTimeout: 30_000,
		hookTimeout: 30_000,
		projects: [
			{
				extends: true,
				test: { name: 'unit', environment: 'node', include: ['src/**/*.test.ts'] }
			},
			{
				extends: true,
				test: { name: 'property', environment: 'node', include: ['tests/property/**/*.test.ts'] }
			}
		]
	}
});
