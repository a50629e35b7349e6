// SPDX-License-Identifier: GPL-3.0-or-later
#include "completion.hpp"

#include <cassert>
#include <map>

#include <fmt/core.h>
#include <fmt/format.h>
#include <fmt/ranges.h>

namespace tonewalk::cli {
namespace {

std::vector<std::string> names_of(const command_facts& command) {
    std::vector<std::string> names;
    for (const option_facts& option : options_of(command)) {
        names.insert(names.end(), option.names.begin(), option.names.end());
    }
    return names;
}

std::vector<std::string> job_names(const option_tree& tree) {
    std::vector<std::string> names;
    for (const command_facts& job : tree.jobs) {
        names.push_back(job.name);
    }
    return names;
}

/// What a script does where this option's value stands.
std::string offer_of(const option_facts& option) {
    const std::vector<std::string> choices = choices_of(option);
    return names_file(option) ? "kind=file"
           : choices.empty()  ? "kind=none"
                              : fmt::format("kind=words offered='{}'", fmt::join(choices, " "));
}

/// For the shells whose `case` is alike: what may follow an option of this command.
std::string value_cases(const command_facts& command) {
    std::map<std::string, std::vector<std::string>> names_by_offer;
    for (const option_facts& option : options_of(command)) {
        if (takes_value(option)) {
            auto& names = names_by_offer[offer_of(option)];
            names.insert(names.end(), option.names.begin(), option.names.end());
        }
    }
    std::string cases;
    for (const auto& [offer, names] : names_by_offer) {
        cases += fmt::format("        {}) {} ;;\n", fmt::join(names, "|"), offer);
    }
    return cases.empty() ? cases : fmt::format("        case $before in\n{}        esac\n", cases);
}

/// One branch a command: the words that may stand here, unless the word before wants a value.
std::string command_cases(const option_tree& tree) {
    std::string cases = fmt::format(
        "    '')\n        offered='{} {}'\n{}        ;;\n", fmt::join(job_names(tree), " "),
        fmt::join(names_of(tree.program), " "), value_cases(tree.program));
    for (const command_facts& job : tree.jobs) {
        cases +=
            fmt::format("    {})\n        offered='{}'\n        [[ $word == -* ]] || kind=file\n"
                        "{}        ;;\n",
                        job.name, fmt::join(names_of(job), " "), value_cases(job));
    }
    return cases;
}

std::string bash_script(const option_tree& tree) {
    return fmt::format(R"(# bash completion for tonewalk
_tonewalk() {{
    local word=${{COMP_WORDS[COMP_CWORD]}} before=${{COMP_WORDS[COMP_CWORD - 1]}}
    local job='' kind=words offered='' each
    if [[ $word == '=' ]]; then # --name= splits here
        word=''
    elif [[ $before == '=' ]]; then
        before=${{COMP_WORDS[COMP_CWORD - 2]}}
    fi
    for each in "${{COMP_WORDS[@]:1:COMP_CWORD-1}}"; do
        case $each in
        {}) job=$each; break ;;
        esac
    done
    case $job in
{}    esac
    COMPREPLY=()
    case $kind in
    file) compopt -o filenames 2>/dev/null; mapfile -t COMPREPLY < <(compgen -f -- "$word") ;;
    words) mapfile -t COMPREPLY < <(compgen -W "$offered" -- "$word") ;;
    esac
}}
complete -F _tonewalk tonewalk
)",
                       fmt::join(job_names(tree), "|"), command_cases(tree));
}

std::string zsh_script(const option_tree& tree) {
    return fmt::format(R"(#compdef tonewalk
# zsh completion for tonewalk
local word=${{words[CURRENT]}} before=${{words[CURRENT-1]}} job='' kind=words offered='' each
if [[ $word == --*=* ]]; then
    before=${{word%%=*}}
    compset -P '*='
    word=$PREFIX
fi
for each in "${{(@)words[2,CURRENT-1]}}"; do
    case $each in
    {}) job=$each; break ;;
    esac
done
case $job in
{}esac
case $kind in
file) _files ;;
words) compadd -- ${{=offered}} ;;
esac
)",
                       fmt::join(job_names(tree), "|"), command_cases(tree));
}

/// In single quotes, as fish reads them.
std::string fish_quoted(std::string_view text) {
    std::string quoted = "'";
    for (const char letter : text) {
        quoted +=
            letter == '\'' || letter == '\\' ? std::string{'\\', letter} : std::string{letter};
    }
    return quoted + "'";
}

std::string fish_option(const option_facts& option, std::string_view condition) {
    std::string line = fmt::format("complete -c tonewalk -n {}", fish_quoted(condition));
    for (const std::string& name : option.names) {
        line += name.rfind("--", 0) == 0 ? " -l " + name.substr(2) : " -s " + name.substr(1);
    }
    if (names_file(option)) {
        line += " -r -F";
    } else if (takes_value(option)) {
        line += fmt::format(" -x -a '{}'", fmt::join(choices_of(option), " "));
    }
    return line + fmt::format(" -d {}\n", fish_quoted(option.text));
}

std::string fish_script(const option_tree& tree) {
    constexpr std::string_view no_job = "__fish_use_subcommand";
    std::string script = "# fish completion for tonewalk\n";
    for (const option_facts& option : options_of(tree.program)) {
        script += fish_option(option, no_job);
    }
    for (const command_facts& job : tree.jobs) {
        script += fmt::format("complete -c tonewalk -n {} -f -a {} -d {}\n", no_job, job.name,
                              fish_quoted(job.answers));
        for (const option_facts& option : options_of(job)) {
            script += fish_option(option, "__fish_seen_subcommand_from " + job.name);
        }
    }
    return script;
}

} // namespace

std::string completion_script(const option_tree& tree, std::string_view shell) {
    if (shell == "bash") {
        return bash_script(tree);
    }
    if (shell == "zsh") {
        return zsh_script(tree);
    }
    assert(shell == "fish");
    return fish_script(tree);
}

} // namespace tonewalk::cli
