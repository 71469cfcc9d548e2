/** The look's tokens. Colours are CSS variables (src/app.css), so one class serves the light and the dark theme. */
/** @type {import('tailwindcss').Config} */
export default {
	content: ['./src/**/*.{html,svelte,ts}'],
	darkMode: ['selector', '[data-theme="dark"]'],
	theme: {
		extend: {
			colors: {
				ground: 'var(--ground)',
				sheet: 'var(--sheet)',
				ink: 'var(--ink)',
				mute: 'var(--mute)',
				rule: 'var(--rule)',
				copper: { DEFAULT: 'var(--copper)', tint: 'var(--copper-tint)' },
				verdigris: { DEFAULT: 'var(--verdigris)', tint: 'var(--verdigris-tint)' },
				amber: 'var(--amber)'
			},
			fontFamily: {
				head: ['"Bricolage Grotesque Variable"', 'sans-serif'],
				text: ['"Instrument Sans Variable"', 'sans-serif'],
				figure: ['"JetBrains Mono Variable"', 'monospace']
			},
			borderRadius: { sheet: '10px', button: '7px', value: '5px' },
			boxShadow: { sheet: '0 1px 2px rgb(0 0 0 / 0.05), 0 8px 28px -12px rgb(0 0 0 / 0.18)' }
		}
	}
};
