// Addresses of the views within the page.

export const loopAddress = (name) => `#/loops/${encodeURIComponent(name)}`;
export const settingsAddress = (name) => `${loopAddress(name)}/settings`;
export const reportAddress = (id) => `#/reports/${encodeURIComponent(id)}`;
export const analysisAddress = (id) => `#/analyses/${encodeURIComponent(id)}`;
