import { resolve } from 'node:path';
import adapter from '@sveltejs/adapter-node';
import { vitePreprocess } from '@sveltejs/vite-plugin-svelte';

/** @typedef {{ include: string[], compilerOptions: { paths: Record<string, string[]> } }} Generated */

/** @type {import('@sveltejs/kit').Config} */
const config = {
	preprocess: vitePreprocess(),
	// Otherwise a component without a script brings Svelte's support for version 4 into every page.
	compilerOptions: { runes: true },
	kit: {
		adapter: adapter({ precompress: true }),
		// The shell is one prerendered page shown under every offline address: with relative asset
		// paths it would look for its scripts below the visited address and stay blank.
		paths: { relative: false },
		// 'auto': hashes in prerendered pages, nonces in rendered ones. 'nonce' fails the build as
		// soon as one page is prerendered.
		csp: {
			mode: 'auto',
			directives: {
				'default-src': ['self'],
				'script-src': ['self'],
				'style-src': ['self'],
				// Kit's announcer of page changes, and drawings to scale, carry style attributes.
				'style-src-attr': ['unsafe-inline'],
				'img-src': ['self', 'data:', 'blob:'],
				'media-src': ['self', 'blob:'],
				'font-src': ['self'],
				'connect-src': ['self'],
				'worker-src': ['self'],
				'manifest-src': ['self'],
				'form-action': ['self'],
				'object-src': ['none'],
				'base-uri': ['none'],
				'frame-ancestors': ['none']
			}
		},
		// Only what is named here is prerendered; following links would ask the server's own pages.
		prerender: { crawl: false, entries: ['/', '/shell'] },
		// Registered by AppUpdate.svelte, which also asks before an update takes over.
		serviceWorker: { register: false },
		typescript: {
			config: (/** @type {Record<string, unknown>} */ { ...config }) => {
				const generated = /** @type {Generated} */ (/** @type {unknown} */ (config));
				return {
					...generated,
					compilerOptions: {
						...generated.compilerOptions,
						// Absolute: the dependency rule reads relative ones from another folder, and would not
						// see what $lib leads to.
						paths: Object.fromEntries(
							Object.entries(generated.compilerOptions.paths).map(([alias, targets]) => [
								alias,
								targets.map((target) => resolve('.svelte-kit', target))
							])
						)
					},
					include: [
						...generated.include,
						'../migrations/**/*.ts',
						'../playwright.config.ts',
						'../eslint.config.js',
						'../svelte.config.js'
					],
					// Kit leaves the service worker out; it is checked like everything else.
					exclude: ['../node_modules/**']
				};
			}
		}
	}
};

export default config;
