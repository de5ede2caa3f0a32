import { describe, expect, it } from 'vitest';
import { passwordProblem } from './password-rules';

const problem = (password: string, email = 'erna.niet@example.org') =>
	passwordProblem(password, email);

describe('a password', () => {
	it('has at least 10 and at most 200 characters, counted as people count them', () => {
		expect(problem('kx9$zz!qp')).toBe('account.password_short');
		expect(problem('kx9$zz!qpw')).toBeUndefined();
		expect(problem('🛩️'.repeat(4))).toBe('account.password_short');
		// Nine letters, however they are composed.
		expect(problem('öäüßéñçåø'.normalize('NFD'))).toBe('account.password_short');
		const long = 'longeron flap gusset doubler '.repeat(7).slice(0, 200);
		expect(problem(long)).toBeUndefined();
		expect(problem(`${long}x`)).toBe('account.password_long');
		expect(problem('x'.repeat(1_000_000))).toBe('account.password_long');
	});

	it.each(['correct horse battery', 'onlylowercasehangar', '8726 3549 1871 63', 'ÄÖÜ ßßß flügel'])(
		'needs no mixture of kinds of characters: %s',
		(password) => {
			expect(problem(password)).toBeUndefined();
		}
	);

	it.each([
		'password123456789',
		'1234567890',
		'qwertyuiop',
		'aaaaaaaaaaaa',
		'abcabcabcabc',
		'P@ssw0rd2026!',
		'1q2w3e4r5t6y7u',
		'iloveyou12345'
	])('is none that anybody would try first: %s', (password) => {
		expect(problem(password)).toBe('account.password_common');
	});

	it.each(['tallybar2026!!xkq', 'xkq TallyBar 77', 'erna.niet 4711 xkq', 'ERNA.NIET-qqkx9'])(
		'names neither the product nor the own address: %s',
		(password) => {
			expect(problem(password)).toBe('account.password_common');
		}
	);

	it('may hold a very short local part by chance', () => {
		expect(problem('halbrunder niet 47', 'al@example.org')).toBeUndefined();
	});

	it('is judged in a moment, also where a program made it to take long', () => {
		problem('a first one loads the dictionary');
		const started = performance.now();
		for (const hostile of ['p@$$w0rd', '4@8({3691!|0$5+7%2', 'a1']) {
			problem(hostile.repeat(200).slice(0, 200));
		}
		expect(performance.now() - started).toBeLessThan(2000);
	});
});
