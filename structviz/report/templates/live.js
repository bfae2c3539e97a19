// Only in pages that are served: asks the server it came from whether there is a newer page.
const VERSION = "$version";
const PLACE = "structviz-place";
const nameOf = (button) => button.querySelector(".name").textContent;
const button = (test) => [...document.querySelectorAll("button.fault")].find(test);

const told = document.createElement("p");
told.id = "live";
told.setAttribute("role", "status");
document.body.append(told);

// What was chosen is found again by name: rows move when a model grows.
document.addEventListener("structviz:pick", ({ detail }) => {
  const row = button((each) => Number(each.dataset.fault) === detail?.fault && detail.fault !== null);
  row ? sessionStorage.setItem(PLACE, nameOf(row)) : sessionStorage.removeItem(PLACE);
});
const before = sessionStorage.getItem(PLACE);
const again = before && button((each) => nameOf(each) === before);
if (again) document.dispatchEvent(new CustomEvent("structviz:pick", { detail: { fault: Number(again.dataset.fault), from: "live" } }));

setInterval(async () => {
  try {
    const now = await (await fetch("/version", { cache: "no-store" })).text();
    told.textContent = "";
    if (now !== VERSION) location.reload();
  } catch {
    told.textContent = "The server has stopped; this page stays as it is.";
  }
}, 1000);
