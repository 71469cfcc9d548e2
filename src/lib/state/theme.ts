/** The theme is a cookie, so that the server writes it into the page and nothing flashes. */
export const themes = ['system', 'light', 'dark'] as const;
export type Theme = (typeof themes)[number];
export const THEME_COOKIE = 'theme';
const YEAR_S = 365 * 24 * 3600;

export function asTheme(value: string | null | undefined): Theme {
	return themes.find((theme) => theme === value) ?? 'system';
}

export function currentTheme(): Theme {
	return asTheme(document.documentElement.dataset.theme);
}

export function applyTheme(theme: Theme) {
	document.documentElement.dataset.theme = theme;
	document.cookie = `${THEME_COOKIE}=${theme}; path=/; max-age=${YEAR_S}; samesite=lax`;
}
