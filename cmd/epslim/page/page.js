"use strict";
(function () {
  function copy(text) {
    if (navigator.clipboard && window.isSecureContext) {
      return navigator.clipboard.writeText(text).catch(function () { return byHand(text); });
    }
    return byHand(text);
  }
  function byHand(text) {
    var area = document.createElement("textarea");
    area.value = text;
    area.className = "away";
    document.body.appendChild(area);
    area.select();
    var done = document.execCommand("copy");
    area.remove();
    return done ? Promise.resolve() : Promise.reject(new Error("not copied"));
  }
  document.querySelectorAll(".formula").forEach(function (box) {
    var tex = box.querySelector("annotation");
    if (!tex) { return; }
    var button = document.createElement("button");
    button.type = "button";
    button.textContent = "TeX";
    button.title = "Copy the TeX of this formula";
    button.setAttribute("aria-label", button.title);
    var said = document.createElement("span");
    said.className = "away";
    said.setAttribute("role", "status");
    button.addEventListener("click", function () {
      copy(tex.textContent).then(function () { return "copied"; }, function () { return "not copied"; }).then(function (word) {
        button.textContent = word;
        said.textContent = word;
        setTimeout(function () { button.textContent = "TeX"; said.textContent = ""; }, 1500);
      });
    });
    box.appendChild(button);
    box.appendChild(said);
  });
})();
