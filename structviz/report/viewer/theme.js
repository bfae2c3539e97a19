// Colours of the page as it is seen now, light or dark; what is drawn with them is told when they change.

const FALLBACK = {
  ink: "#22303c", faint: "#9aa5ad", raised: "#ffffff", quiet: "#5b6872", hair: "#d9d7d0",
  sigma1: "#22303c", sigma2: "#7a6a8e", sigma3: "#d9a12b", lens: "#e2c37f", thumb: "#22303c", horizon: "#9aa5ad",
  conflicting: "#a33a1c", undetermined: "#d9cba6", consistent: "#7b98a8",
};

export function makeTheme() {
  const style = getComputedStyle(document.documentElement);
  const colour = (name) => style.getPropertyValue(`--${name}`).trim() || FALLBACK[name];
  const painted = new Map();

  return {
    colour,
    // A material that keeps the colour of its name, whichever way the page is seen.
    paints(material, name) {
      material.color.set(colour(name));
      painted.set(material, name);
      return material;
    },
    forget: (material) => painted.delete(material),
    listen(changed) {
      const again = () => {
        for (const [material, name] of painted) material.color.set(colour(name));
        changed();
      };
      matchMedia("(prefers-color-scheme: dark)").addEventListener("change", again);
      document.addEventListener("structviz:theme", again);
    },
  };
}
