import js from '@eslint/js';
import svelte from 'eslint-plugin-svelte';
import globals from 'globals';
import { defineConfig, globalIgnores } from 'eslint/config';
import ts from 'typescript-eslint';
import svelteConfig from './svelte.config.js';

export default defineConfig(
	globalIgnores([
		'build/',
		'.svelte-kit/',
		'node_modules/',
		'data/',
		'test-results/',
		'playwright-report/'
	]),
	js.configs.recommended,
	ts.configs.strictTypeChecked,
	svelte.configs.recommended,
	{
		languageOptions: {
			globals: { ...globals.browser, ...globals.node },
			parserOptions: { projectService: true, extraFileExtensions: ['.svelte'] }
		},
		rules: {
			'@typescript-eslint/no-explicit-any': 'error',
			// The type checker reports it, and knows more.
			'no-undef': 'off',
			'@typescript-eslint/restrict-template-expressions': ['error', { allowNumber: true }],
			// Served from the root of its own host; links are written as people read them.
			'svelte/no-navigation-without-resolve': 'off'
		}
	},
	{
		files: ['**/*.svelte', '**/*.svelte.ts'],
		languageOptions: { parserOptions: { parser: ts.parser, svelteConfig } }
	},
	{
		// Plain JavaScript with JSDoc types: a typed declaration is the only way to say what JSON holds.
		files: ['src/bin/*.js', 'tests/bench/*.js', '*.config.js'],
		rules: { '@typescript-eslint/no-unsafe-assignment': 'off' }
	},
	{
		// A dependency-cruiser configuration is CommonJS.
		files: ['**/*.cjs'],
		extends: [ts.configs.disableTypeChecked]
	},
	{
		// A migration runs on the database as it was, not as the code of today knows it.
		files: ['migrations/*.ts'],
		rules: { '@typescript-eslint/no-explicit-any': 'off' }
	}
);
