import { sveltekit } from '@sveltejs/kit/vite';
import tailwindcss from '@tailwindcss/vite';
import { SvelteKitPWA } from '@vite-pwa/sveltekit';
import type { Rolldown } from 'vite';
import { defineConfig } from 'vitest/config';

/** SvelteKit's entries, the root layout and the root error page. */
const EVERY_PAGE = /\/(runtime\/client\/entry|client-optimized\/(app|nodes\/[01]))\.js$/;
const SHOP_LAYOUT = /\/src\/routes\/\(shop\)\/\+layout\.(svelte|ts)$/;

/** One chunk of everything that a module of `roots` imports at once, directly or not. */
function below(debugName: string, roots: RegExp): Rolldown.CodeSplittingGroup {
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
					output: {
						// gzip starts anew with each file, and forty small ones cost a tenth of what they hold. These two
						// every page, and every page of the shop, loads whole in any case; the rest is as pages share it.
						codeSplitting: { groups: [below('app', EVERY_PAGE), below('shop', SHOP_LAYOUT)] }
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
